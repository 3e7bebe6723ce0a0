"""Comparing an exported function with the formula in long numbers, and with a solver."""

from __future__ import annotations

import random
from collections.abc import Callable, Container, Iterator, Mapping, Sequence
from fractions import Fraction
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from ...errors import NotApplicable, SolveError
from ...tabulate.symbolic import beta
from ..perron import eigenvalue_symbol
from ..spectrum import Factor, leading_factor
from ..verify import has_weights

if TYPE_CHECKING:
    from ..closed import ClosedForm

__all__ = ["Reference", "formula", "leading"]

#: Temperatures of the comparison, in units of the couplings, which are of order 1.
_TEMPERATURES = ("3", "0.7", "0.2", "0.05", "0.01")
#: Points per temperature.
_POINTS = 4
#: What solutions in doubles leave of 0.
_ROUNDING = {"entropy": 1e-15, "specific_heat": 1e-15, "susceptibility": 1e-25}
#: Tries for values at which all weights are positive.
_ATTEMPTS = 200
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

        # Fewer digits than lie between the Boltzmann factors may agree on what is left of them.
        energy = sum(abs(value) for name, value in point.items() if name != "T")
        digits, last = _FIRST_DIGITS + int(energy / point.get("T", 1)), mp.inf
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
                self._agree_with(solver, function, point)

    def _agree_with(self, solver: Callable[[Any], Any], function: Any, point: dict[str, Fraction]) -> None:
        try:
            member = getattr(solver(self.form.chain.at(**point)), self.name)
            value = member(*self.observables) if callable(member) else member
        except SolveError:
            # Classes that are apart by less than rounding are a tie for numbers, not for a formula.
            return
        self._agree(function, point, float(value), "the solver", _ROUNDING.get(self.name, 0.0))

    def _points(self, names: Sequence[str]) -> Iterator[tuple[dict[str, Fraction], bool]]:
        """Yield random points down to low temperature, and whether they are special."""
        draw = random.Random(11)
        numbers = {states.number for states in self.form.chain.cell.values()}
        signed = [name for name in names if name not in self._positive and name not in numbers and name != "T"]
        for T in _TEMPERATURES if "T" in names else ("1",) * 3:
            fixed = {"T": Fraction(T)} if "T" in names else {}
            for _ in range(_POINTS):
                point = self._random(draw, names, signed, numbers) | fixed
                yield point, False
            if not signed:
                continue
            # On a line of symmetry, and next to it; where all couplings tie.
            some = draw.choice(signed)
            special = [{some: Fraction(0)}, {some: point[some] / 10**3}, dict.fromkeys(signed, Fraction(1))]
            yield from (({**point, **change}, True) for change in special if self._allowed({**point, **change}))

    @cached_property
    def _positive(self) -> set[str]:
        """Names of what occurs in weights."""
        import sympy as sp

        logs = [key for key in self.form.spectrum.matrix.alphabet.classes if isinstance(key, sp.log)]
        return {symbol.name for key in logs for symbol in key.free_symbols}

    def _random(
        self, draw: random.Random, names: Sequence[str], signed: Sequence[str], numbers: Container[str | None]
    ) -> dict[str, Fraction]:
        """Return values of order 1 at which all weights are positive."""
        point: dict[str, Fraction] = {}
        for _ in range(_ATTEMPTS):
            for name in names:
                point[name] = Fraction(draw.randint(3, 9)) if name in numbers else Fraction(draw.randint(20, 150), 100)
                if name in signed:
                    point[name] *= draw.choice((1, -1))
            if self._allowed(point):
                break
        return point

    def _allowed(self, point: Mapping[str, Fraction]) -> bool:
        import sympy as sp

        alphabet = self.form.spectrum.matrix.alphabet
        if not alphabet.mixed:
            return True
        values = {"beta": 1 / point.get("T", Fraction(1)), **point}
        symbols = set().union(*(key.free_symbols for key in alphabet.classes))
        return has_weights(alphabet, {s: sp.Rational(str(values[s.name])) for s in symbols})

    def _agree(
        self, function: Any, point: dict[str, Fraction], expected: float, whose: str, rounding: float = 0.0
    ) -> None:
        given = {key: float(value) for key, value in point.items()}
        with np.errstate(all="ignore"):
            got = float(function(**given))
        scale = abs(expected)
        if self.name in ("free_energy", "internal_energy", "mean"):
            # Sums of energies of either sign and differences of probabilities are right to rounding of their parts.
            scale = max(scale, 1.0 if self.name == "mean" else max(map(abs, given.values()), default=1.0))
        allowed = max(_TOLERANCE * scale, rounding)
        if not (got == expected or abs(got - expected) <= allowed or max(abs(got), scale) < _TINY):
            where = ", ".join(f"{key}={value:g}" for key, value in given.items())
            raise SolveError(
                f"the NumPy function of {self.name} for {self.form.chain.name} gives {got!r} at {where}, but {whose} "
                f"{expected!r}: terms of its formula cancel there. Use solve(chain.at(…)) for this quantity"
            )
