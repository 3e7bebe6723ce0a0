"""Tables of terms in exact fractions at exact parameters."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from fractions import Fraction
from numbers import Rational, Real
from typing import Any

import numpy as np

from ..declare import Chain, Point, StateSet, Term
from ..errors import DeclarationError, NotApplicable, ParameterError, SolveError, listing
from ..tabulate.affine import affine_table
from ..tabulate.calling import call_sites, number_table
from ..tabulate.tracer import Inexact, exact_number

__all__ = ["exact_table", "exact_values", "refuse_thermal"]

#: Dyadic fractions up to this denominator are taken as meant; longer ones as rounding.
_DYADIC = 2**40
#: A decimal with more digits than this is a rounded number.
_DIGITS = 12


def refuse_thermal(chain: Chain) -> None:
    """Refuse chains without a temperature-independent energy.

    Raises
    ------
    NotApplicable
        An energy takes ``T``, or a term is a `weight`.
    """
    for term in chain.terms:
        if term.role == "weight":
            raise NotApplicable(
                f"{term.label} is a weight(…), a Boltzmann factor at every temperature, so the chain has no ground "
                "state; write it as an energy, or solve at a small T > 0"
            )
        if term.takes_temperature:
            raise NotApplicable(
                f"the energy {term.label} takes T, so the chain has no ground state; write an energy that does not "
                "depend on T, or solve at a small T > 0"
            )


def exact_values(chain: Chain | Point, running: Sequence[str] = ()) -> dict[str, Fraction]:
    """Return every parameter as a fraction, from what is fixed and from defaults.

    Parameters
    ----------
    chain : Chain or Point
        A chain with fixed parameters, or a single point, whose T is not looked at.
    running : sequence of str
        Parameters that need no value.

    Raises
    ------
    ParameterError
        A parameter without a value, an array, or an infinite value.
    """
    declared = chain.chain if isinstance(chain, Point) else chain
    given = dict(chain.values) if isinstance(chain, Point) else {**chain.defaults, **chain.fixed}
    values: dict[str, Fraction] = {}
    missing = []
    for name in declared.parameters:
        value = given.get(name)
        if name in running:
            continue
        if value is None:
            missing.append(name)
        elif isinstance(value, Fraction):
            values[name] = value
        elif isinstance(value, float):
            raise SolveError(
                f"parameter {name!r} is infinite; forbid configurations by returning math.inf from the term instead"
            )
        else:
            raise ParameterError(
                f"parameter {name!r} is an array, and a ground state belongs to one point; "
                "give a single number, or use phase_diagram"
            )
    if missing:
        raise ParameterError(
            f"no value for {listing(missing)}; a ground state needs every parameter: "
            f"chain.fix({', '.join(f'{name}=…' for name in missing)})"
        )
    return values


def exact_table(term: Term, states: Sequence[StateSet], values: Mapping[str, Fraction]) -> tuple[np.ndarray, bool]:
    """Tabulate a term in fractions.

    Parameters
    ----------
    term : Term
        An energy or an observable.
    states : sequence of StateSet
        One per place of the term.
    values : mapping
        Its parameters.

    Returns
    -------
    table : ndarray of object, shape (*states)
        Fractions; ``math.inf`` where a configuration is forbidden.
    exact : bool
        False where the function returned rounded numbers (of transcendental functions,
        say), which then stand for their shortest decimals.

    Examples
    --------
    >>> from tmsolve.declare import bond, ising
    >>> exact_table(bond(lambda s, t, J: -J*s*t), [ising(), ising()], {"J": Fraction(1, 3)})[0][0].tolist()
    [Fraction(-1, 3), Fraction(1, 3)]
    """
    affine = affine_table(term, states)
    if affine is not None:
        total, parts = affine.constant, [affine.constant]
        for name, slope in affine.slopes.items():
            total = total + slope * values[name]
            parts.append(slope)
        return total, all(_as_meant(entry) for part in parts for entry in part.ravel())
    floats = number_table(term, states, {name: float(value) for name, value in values.items()}, 1)[..., 0]
    try:
        called = call_sites(term, states, lambda state: state, values)
        pairs = [_fraction(entry) for entry in called.ravel()]
    except Exception:  # the function works on floats only, as it did just before
        pairs = []
    exact = np.empty(floats.shape, dtype=object)
    if pairs:
        exact.reshape(-1)[:] = [number for number, _ in pairs]
    if not pairs or not _agree(exact, floats):
        pairs = [_fraction(entry) for entry in floats.ravel().tolist()]
        exact.reshape(-1)[:] = [number for number, _ in pairs]
    return exact, all(meant for _, meant in pairs)


def _fraction(entry: Any) -> tuple[Fraction | float, bool]:
    """Return a number as a fraction, and whether it is exactly what was meant."""
    if isinstance(entry, Rational):
        return Fraction(int(entry.numerator), int(entry.denominator)), True
    if isinstance(entry, (bool, np.bool_)) or not isinstance(entry, Real):
        raise DeclarationError(f"{entry!r} is not a real number")
    number = float(entry)
    if math.isinf(number):
        return number, True
    try:
        return exact_number(number), True
    except Inexact:
        return Fraction(repr(number)), _as_meant(Fraction(repr(number)))


def _as_meant(number: Any) -> bool:
    """Whether a fraction is short enough not to be a rounded float in disguise."""
    if not isinstance(number, Fraction):
        return True
    rest, twos, fives = number.denominator, 0, 0
    if rest <= _DYADIC and rest & (rest - 1) == 0:
        return True
    while rest % 2 == 0:
        rest, twos = rest // 2, twos + 1
    while rest % 5 == 0:
        rest, fives = rest // 5, fives + 1
    return rest != 1 or len(str(abs(number.numerator) * 10 ** max(twos, fives) // number.denominator)) <= _DIGITS


def _agree(exact: np.ndarray, floats: np.ndarray) -> bool:
    for fraction, number in zip(exact.ravel(), floats.ravel().tolist(), strict=True):
        if math.isinf(number) != (fraction == math.inf):
            return False
        if not math.isinf(number) and abs(float(fraction) - number) > 1e-9 * max(1.0, abs(number)):
            return False
    return True
