"""Comparing an exported function with the formula in long numbers, and with a solver."""

from __future__ import annotations

import random
from collections.abc import Callable, Iterator, Sequence
from fractions import Fraction
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from ...errors import NotApplicable, SolveError
from ...tabulate.symbolic import beta
from ..perron import eigenvalue_symbol
from ..spectrum import Factor, leading_factor

if TYPE_CHECKING:
    from ..closed import ClosedForm

__all__ = ["Reference", "formula", "leading"]

#: Temperatures of the comparison, in units of the couplings, which are of order 1.
_TEMPERATURES = ("3", "0.7", "0.2", "0.05", "0.01")
#: Points per temperature.
_POINTS = 2
#: Relative agreement asked for.
_TOLERANCE = 1e-9
#: Doubles below this do not have all their digits.
_TINY = 1e-280
#: Values below this are 0 as doubles.
_NOTHING = 1e-290
_FIRST_DIGITS, _MOST_DIGITS = 60, 4000
#: Derivatives of the free energy by T that a quantity is made of.
_ORDERS = {"internal_energy": 1, "entropy": 1, "specific_heat": 2}


class _Undecided(SolveError):
    """A formula has no digits at a point, however many it is evaluated with."""


def formula(form: ClosedForm, name: str, observables: tuple[str, ...]) -> Any:
    """Return the expression of a quantity, or say that there is none."""
    member = getattr(form, name)
    expr = member(*observables) if observables else member
    if expr.has(eigenvalue_symbol()):
        raise NotApplicable(
            f"the largest eigenvalue of this chain is not written by radicals ({form.why}), so that there is nothing "
            "to export; use solve(chain.at(…)) for numbers"
        )
    return expr


def leading(form: ClosedForm) -> Factor:
    """Return the factor of the Perron root."""
    return form.spectrum.factors[leading_factor(form.spectrum)[0]]


class Reference:
    """Values of a quantity of a closed form, in long numbers.

    What follows from the free energy is taken from it by differences in numbers long enough, so
    that the reference does not share the algebra of derivatives.

    Parameters
    ----------
    form : ClosedForm
        Where it comes from.
    name, observables : str, tuple of str
        The quantity.
    """

    def __init__(self, form: ClosedForm, name: str, observables: tuple[str, ...]) -> None:
        self.form = form
        self.name = name
        self.observables = observables
        self.order = _ORDERS.get(name, 0)
        if self.order and "T" in form.chain.fixed:
            formula(form, name, observables)  # says that T is fixed
        self.expr = formula(form, "free_energy" if self.order else name, observables)

    @cached_property
    def _function(self) -> tuple[list[Any], Any]:
        import sympy as sp

        symbols = sorted(self.expr.free_symbols | ({beta()} if self.order else set()), key=str)
        return symbols, sp.lambdify(symbols, self.expr, modules="mpmath")

    def _at(self, point: dict[str, Fraction], digits: int) -> Any:
        """Evaluate with so many digits, of which differences leave half."""
        import mpmath as mp

        symbols, function = self._function

        def number(name: str) -> Any:
            return mp.mpf(point[name].numerator) / point[name].denominator

        def value(T: Any) -> Any:
            return mp.re(function(*(1 / T if s == beta() else number(s.name) for s in symbols)))

        T = number("T") if "T" in point else mp.mpf(1)
        if not self.order:
            return value(T)
        step = T * mp.mpf(10) ** (-digits // 4)
        low, here, high = value(T - step), value(T), value(T + step)
        slope = (high - low) / (2 * step)
        if self.name == "specific_heat":
            return -T * (high - 2 * here + low) / step**2
        return here - T * slope if self.name == "internal_energy" else -slope

    def value(self, point: dict[str, Fraction]) -> float:
        """Evaluate with as many digits as it takes to have sixteen of the result."""
        import mpmath as mp

        digits, last = _FIRST_DIGITS, mp.inf
        while digits <= _MOST_DIGITS:
            with mp.workdps(digits + 10):
                try:
                    number = self._at(point, digits)
                except ZeroDivisionError:  # a ratio of eigenvalues is 1 to these digits
                    number = mp.inf
                # What is not above what rounding and differences leave may be nothing at all.
                noise = float(sum(map(abs, point.values()), Fraction(1))) * mp.mpf(10) ** (-digits // 3)
                if mp.isfinite(number) and abs(number - last) <= max(abs(number) * mp.mpf(10) ** -16, _NOTHING):
                    if abs(number) > noise or noise < _NOTHING:
                        return float(number)
                last = number
            digits *= 2
        raise _Undecided(f"the formula of {self.name} could not be evaluated with {_MOST_DIGITS} digits at {point}")

    def compare(self, function: Any, arguments: Sequence[str], solver: Callable[[Any], Any] | None) -> None:
        """Raise where the function disagrees with the formula, or with a solver."""
        chain = self.form.chain
        if solver is not None and any(states.number for states in chain.cell.values()):
            raise NotApplicable("a symbolic number of colours has no solution with numbers; leave solver= out")
        for point, special in self._points(arguments):
            try:
                self._agree(function, point, self.value(point), "the formula")
            except _Undecided:
                # An eigenvalue that vanishes on a line is never 0 to all digits.
                if not special:
                    raise
            if solver is not None:
                member = getattr(solver(chain.at(**point)), self.name)
                value = member(*self.observables) if callable(member) else member
                self._agree(function, point, float(value), "the solver")

    def _points(self, names: Sequence[str]) -> Iterator[tuple[dict[str, Fraction], bool]]:
        """Yield random points down to low temperature, and whether they are special.

        Weights and numbers of colours are positive.
        """
        import sympy as sp

        draw = random.Random(11)
        chain = self.form.chain
        logs = [key for key in self.form.spectrum.matrix.alphabet.classes if isinstance(key, sp.log)]
        positive = {symbol.name for key in logs for symbol in key.free_symbols}
        numbers = {states.number for states in chain.cell.values()}
        for T in _TEMPERATURES if "T" in names else ("1",) * 3:
            for _ in range(_POINTS):
                point = {name: Fraction(draw.randint(20, 150), 100) for name in names}
                for name in names:
                    if name in numbers:
                        point[name] = Fraction(draw.randint(3, 9))
                    elif name not in positive:
                        point[name] *= draw.choice((1, -1))
                if "T" in names:
                    point["T"] = Fraction(T)
                yield point, False
            # On a line of symmetry, and next to it.
            signed = [name for name in names if name not in positive and name not in numbers and name != "T"]
            if signed:
                some = draw.choice(signed)
                yield {**point, some: Fraction(0)}, True
                yield {**point, some: point[some] / 10**3}, True

    def _agree(self, function: Any, point: dict[str, Fraction], expected: float, whose: str) -> None:
        given = {key: float(value) for key, value in point.items()}
        with np.errstate(all="ignore"):
            got = float(function(**given))
        scale = abs(expected)
        if self.name in ("free_energy", "internal_energy", "mean"):
            # Sums of energies of either sign and differences of probabilities are right to rounding of their parts.
            scale = max(scale, 1.0 if self.name == "mean" else max(map(abs, given.values()), default=1.0))
        if not (got == expected or abs(got - expected) <= _TOLERANCE * scale or max(abs(got), scale) < _TINY):
            where = ", ".join(f"{key}={value:g}" for key, value in given.items())
            raise SolveError(
                f"the NumPy function of {self.name} for {self.form.chain.name} gives {got!r} at {where}, but {whose} "
                f"{expected!r}: terms of its formula cancel there. Use solve(chain.at(…)) for this quantity"
            )
