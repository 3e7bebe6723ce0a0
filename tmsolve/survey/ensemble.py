"""Chains at a prescribed mean instead of a prescribed field."""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..declare import Chain, Point
from ..declare.values import parse_value
from ..errors import NotApplicable, ParameterError
from .bound import require_bound, require_field
from .sources import attainable, with_source
from .tilt import Tilt

__all__ = ["FieldForMean", "bound_values", "exact_means", "field_for_mean", "source_tilt"]


@dataclass(frozen=True, eq=False)
class FieldForMean:
    """The field that gives an observable a prescribed mean, made by `field_for_mean`.

    Attributes
    ----------
    observable : str
    mean : ndarray, shape (*batch,)
        The prescribed means per cell.
    field : str
        Name of the parameter that was adjusted, in ``point.chain``.
    value : ndarray, shape (*batch,)
        Its values.
    error : ndarray, shape (*batch,)
        Bounds on their numerical errors.
    interval : (float, float) or None
        Open interval of all means that a field can give, where it is known.
    point : Point
        The chain there: ``solve(result.point)`` gives everything else at that mean.
    """

    observable: str
    mean: np.ndarray
    field: str
    value: np.ndarray
    error: np.ndarray
    interval: tuple[float, float] | None
    point: Point


def field_for_mean(chain: Chain, observable: str, mean: Any, *, field: str | None = None) -> FieldForMean:
    """Find the field that gives an observable a prescribed mean: the ensemble of fixed ⟨a⟩.

    The root of ⟨a⟩(φ) − mean, by Newton's method on the exact response ∂⟨a⟩/∂φ, kept inside
    a bracket; the last digits come from long numbers where doubles do not hold them, as
    close to saturation.

    Parameters
    ----------
    chain : Chain
        Everything but the field fixed or with a default, T included.
    observable : str
        Name of an observable.
    mean : number or array
        Prescribed means per cell.
    field : str, optional
        The parameter to adjust, such as ``"h"`` or ``"mu"``. Left out, a term −φ·a is added
        to the energy, whose φ moves the mean monotonically over all that is possible. A
        parameter of weights only is searched among positive values.

    Returns
    -------
    FieldForMean

    Raises
    ------
    ParameterError
        Unknown, fixed or missing names.
    NotApplicable
        A mean that cannot be reached; the message names the interval of those that can. Its
        ends themselves need an infinite field. Where ⟨a⟩ is no monotone function of a named
        field there may be several; the one found is near its default, else near 0.

    Notes
    -----
    The Legendre pair of field and mean: common practice, no source.

    Examples
    --------
    >>> from tmsolve import models
    >>> chain = models.load("ising").chain.fix(J="0.5", T=1)
    >>> round(float(field_for_mean(chain, "m", "0.6376526443593105", field="h").value), 12)
    0.3
    """
    if field is None:
        require_bound("field_for_mean", chain, ())
    else:
        require_field("field_for_mean", chain, field)
        require_bound("field_for_mean", chain, (field,))
    chain.observable(observable)
    given, wanted = exact_means(mean)
    tilt = source_tilt(chain, observable) if field is None else _named_tilt(chain, observable, field)
    if tilt.ends is not None:
        for target in wanted:
            if not tilt.ends[0] < target < tilt.ends[1]:
                _refuse(observable, target, tilt.ends)
    value, error = tilt.roots(wanted)
    value, error = np.reshape(value, given.shape)[()], np.reshape(error, given.shape)[()]
    interval = None if tilt.ends is None else (float(tilt.ends[0]), float(tilt.ends[1]))
    point = tilt.chain.at(**{tilt.field: value})
    return FieldForMean(observable, given[()], tilt.field, value, error, interval, point)


def _refuse(observable: str, target: Fraction, ends: tuple[Fraction, Fraction]) -> None:
    if ends[0] == ends[1]:
        raise NotApplicable(
            f"{observable} is {_text(ends[0])} in every allowed configuration, and no field moves its mean to "
            f"{_text(target)}"
        )
    limit = "is reached only by an infinite field" if target in ends else "cannot be reached"
    raise NotApplicable(
        f"the mean {_text(target)} of {observable} {limit}; allowed are means per cell strictly between "
        f"{_text(ends[0])} and {_text(ends[1])}"
    )


def _text(number: Fraction) -> str:
    return str(number) if number.denominator < 1000 else f"{float(number):.12g}"


def exact_means(mean: Any) -> tuple[np.ndarray, list[Fraction]]:
    """Return values as an array of doubles and as a flat list of fractions.

    Raises
    ------
    ParameterError
        Not real finite numbers.
    """
    parsed = parse_value("mean", mean)
    if isinstance(parsed, (Fraction, float)):
        numbers: list[Any] = [parsed]
    else:
        numbers = [parse_value("mean", number) for number in parsed.ravel().tolist()]
    wanted = [number for number in numbers if isinstance(number, Fraction)]
    if len(wanted) < len(numbers):
        raise ParameterError(f"means are finite numbers, got {mean!r}")
    return np.asarray(parsed, dtype=np.float64), wanted


def bound_values(chain: Chain) -> dict[str, Fraction]:
    """Return the values of everything that is fixed or has a default, ``"T"`` included."""
    return {name: value for name, value in {**chain.defaults, **chain.fixed}.items() if isinstance(value, Fraction)}


def source_tilt(chain: Chain, observable: str) -> Tilt:
    """Return the mean as a function of a field that is added to the chain."""
    ends = attainable(chain, observable, bound_values(chain))
    other, name = with_source(chain, observable)
    spread = float(ends[1] - ends[0]) or 1.0
    unit = float(bound_values(chain)["T"]) / spread
    return Tilt(other, name, observable, unit, ends=ends, size=_size(ends))


def _named_tilt(chain: Chain, observable: str, field: str) -> Tilt:
    values = bound_values(chain)
    weighted = {term.role for term in chain.terms if field in term.parameters} == {"weight"}
    start = values.setdefault(field, Fraction(1 if weighted else 0))
    size = _size(attainable(chain, observable, values))
    if weighted:
        center = math.log(start) if start > 0 else 0.0
        return Tilt(chain, field, observable, 1.0, center, logarithmic=True, size=size)
    return Tilt(chain, field, observable, float(values["T"]), float(start), size=size)


def _size(ends: tuple[Fraction, Fraction]) -> float:
    return max(abs(float(end)) for end in ends) or 1.0
