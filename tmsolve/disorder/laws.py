"""Reading the laws of random parameters in every form that a user may give them."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ..declare.values import LARGEST, parse_value
from ..errors import DeclarationError, ParameterError
from .densities import Counting, Density
from .kinds import Law, Mixture, Normal, Realisation, Sampler, Uniform
from .texts import read_law

__all__ = ["Law", "Mixture", "Normal", "Realisation", "Sampler", "Uniform", "as_law"]

#: Probabilities given in doubles may miss one by so much.
_ROUNDING = Fraction(1, 10**12)
#: A discrete distribution with more values than this is drawn from, never summed over.
_MOST_VALUES = 10_000


def as_law(value: Any, name: str = "random") -> Law:
    """Read the law of a random parameter in any of the forms a user may give it.

    Parameters
    ----------
    value : mapping, distribution, callable, sequence, str or Law
        ``{value: probability}``; an object with scipy.stats' frozen interface
        (``rvs(size, random_state)`` and ``mean()``); a function ``f(rng, size)``; a list of values, which is one
        realisation; or a text such as ``"normal(1,0.5)"``, ``"uniform(-1,1)"``, ``"choice(-1:0.5,1:0.5)"``.
    name : str
        Of the parameter, for messages.

    Returns
    -------
    Law
        With ``draw(rng, shape)``, ``mean``, ``support`` and ``quadrature(count)``.

    Raises
    ------
    DeclarationError
        No such law, an infinite mean, or probabilities that do not sum to one.
    ParameterError
        A value that is not a real number.

    Examples
    --------
    >>> law = as_law({-1: "1/3", 1: "2/3"})
    >>> law.support
    ((Fraction(-1, 1), Fraction(1, 3)), (Fraction(1, 1), Fraction(2, 3)))
    >>> as_law("normal(1, 0.5)").mean
    1.0
    """
    if isinstance(value, (Mixture, Normal, Uniform, Sampler, Realisation)):
        return value
    if isinstance(value, str):
        return as_law(read_law(value), name)
    if isinstance(value, Mapping):
        return _mixture(value, name)
    if hasattr(value, "rvs") and hasattr(value, "mean"):
        return _distribution(value, name)
    if callable(value):
        return Sampler(value)
    if isinstance(value, (Sequence, np.ndarray)):
        return _realisation(value, name)
    raise DeclarationError(
        f"the law of a random parameter is {{value: probability}}, a distribution of scipy.stats, a function "
        f'f(rng, size), a list of values, or a text such as "normal(1,0.5)"; got {value!r}'
    )


def _mixture(given: Mapping[Any, Any], name: str) -> Mixture:
    if not given:
        raise DeclarationError("a mixture needs at least one value: {value: probability}")
    chances: dict[Fraction, Fraction] = {}
    for raw, chance in given.items():
        value, part = parse_value(name, raw), _probability(raw, chance)
        if not isinstance(value, Fraction):
            raise ParameterError(f"the random parameter {name!r} takes finite numbers, got {raw!r}")
        chances[value] = chances.get(value, Fraction(0)) + part
    total = sum(chances.values(), Fraction(0))
    if abs(total - 1) > _ROUNDING:
        raise DeclarationError(
            f"the probabilities of a mixture sum to {float(total):g}, not to one; got {_shown(given)}"
        )
    return Mixture(tuple((value, chance / total) for value, chance in chances.items() if chance))


def _probability(value: Any, chance: Any) -> Fraction:
    try:
        part = parse_value("probability", chance)
    except ParameterError:
        part = None  # type: ignore[assignment]
    if not isinstance(part, Fraction) or part < 0:
        raise DeclarationError(f"the probability of {value!r} must be a number from 0 to 1, got {chance!r}")
    return part


def _shown(given: Mapping[Any, Any]) -> str:
    """Write a mixture as one would, without the names of classes."""
    return "{" + ", ".join(f"{value}: {chance}" for value, chance in given.items()) + "}"


def _realisation(given: Any, name: str) -> Realisation:
    values = parse_value(name, given)
    if not isinstance(values, np.ndarray) or values.ndim != 1 or not np.isfinite(values).all():
        raise DeclarationError(f"the list of values of {name!r} is one row of finite numbers, got {given!r}")
    return Realisation(values)


def _distribution(given: Any, name: str) -> Law:
    mean = float(given.mean())
    if not math.isfinite(mean):
        raise DeclarationError(
            f"the law {_named(given)} of {name!r} has no finite mean (scipy.stats gives {mean:g}): its parameters are "
            "out of range, or averages over it do not exist. Give one with a finite mean"
        )
    if hasattr(given, "std") and float(given.std()) == 0.0:
        return _mixture({mean: 1}, name)
    _check_size(name, mean, float(given.std()) if hasattr(given, "std") else 0.0)
    kind = _named(given)
    if kind == "norm":
        return Normal(mean, float(given.std()))
    if kind == "uniform":
        low, high = given.support()
        return Uniform(float(low), float(high))
    discrete = _discrete(given, name)
    if discrete is not None:
        return discrete
    quantile = getattr(given, "ppf", None)
    return Sampler(lambda rng, size: given.rvs(size=size, random_state=rng), mean, quantile, _rule(given))


def _check_size(name: str, *numbers: float) -> None:
    worst = max(map(abs, numbers))
    if worst > LARGEST and math.isfinite(worst):
        raise ParameterError(f"the law of {name!r} has numbers beyond 1e50; measure energies in a larger unit")


def _rule(given: Any) -> Density | Counting | None:
    if not all(hasattr(given, name) for name in ("ppf", "isf", "cdf", "sf", "support")):
        return None
    low, high = (float(end) for end in given.support())
    if hasattr(getattr(given, "dist", None), "pmf"):
        return Counting(given.pmf, given.cdf, given.sf, (low, high))
    return Density(given.pdf, given.cdf, given.ppf, given.isf, (low, high)) if hasattr(given, "pdf") else None


def _named(given: Any) -> str:
    return str(getattr(getattr(given, "dist", None), "name", None) or type(given).__name__)


def _discrete(given: Any, name: str) -> Mixture | None:
    if not hasattr(getattr(given, "dist", None), "pmf"):
        return None
    known = getattr(given.dist, "xk", None)
    low, high = given.support()
    if known is None and (not math.isfinite(low) or not math.isfinite(high) or high - low > _MOST_VALUES):
        return None
    values = np.asarray(known if known is not None else np.arange(int(low), int(high) + 1))
    return _mixture({value.item(): float(given.pmf(value)) for value in values}, name)
