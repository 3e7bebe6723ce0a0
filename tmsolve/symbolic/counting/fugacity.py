"""The complex variable of a partition function, and what its other Boltzmann factors are worth.

A parameter p enters the energy as E₀ + p φ. The values of φ lie on a lattice of step g, so that
Z is a polynomial in z = exp(−β g p); its coefficients are sums of exp(−β E₀). With T as the
variable, z = exp(−β g) with the step g of the energies themselves.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from ...declare.chain import Chain
from ...errors import NotApplicable, ParameterError, did_you_mean, listing
from .certified import Coefficients
from .counted import Counts
from .squarefree import MixedTerms

__all__ = [
    "Fugacity",
    "check_variable",
    "classes",
    "inverse_temperature",
    "numeric_coefficients",
    "polynomial_of",
]


@dataclass(frozen=True)
class Fugacity:
    """A complex Boltzmann factor z, and positive ones y₀, y₁, … that are numbers.

    Attributes
    ----------
    variable : str
        A parameter, or "T".
    step : Fraction
        z = exp(−β · step · parameter), or exp(−β · step) for "T".
    rates : tuple
        y_k = exp(−rate); sympy numbers or Fractions, divided by T already.
    """

    variable: str
    step: Fraction
    rates: tuple[Any, ...]

    @property
    def text(self) -> str:
        """What z is."""
        factor = "" if self.step == 1 else f"{self.step}*"
        return f"z = exp(-{factor}beta)" if self.variable == "T" else f"z = exp(-{factor}beta*{self.variable})"

    @property
    def factors(self) -> dict[Any, Any]:
        """Exact values of the y."""
        import sympy as sp

        return {sp.Symbol(f"y{k}"): sp.exp(-sp.sympify(rate)) for k, rate in enumerate(self.rates)}


def check_variable(chain: Chain, variable: Any) -> None:
    """Check that everything but the variable has a number."""
    known = (*chain.parameters, "T")
    if not isinstance(variable, str) or variable not in known:
        raise ParameterError(
            f"zeros are sought in a parameter or in T, got {variable!r}; this chain has {listing(known)}."
            f"{did_you_mean(str(variable), known)}"
        )
    if variable in chain.fixed:
        raise ParameterError(f"{variable!r} is fixed in this chain, and zeros are sought in it; leave it free")
    others = [name for name in chain.free if name != variable]
    if others:
        raise ParameterError(
            f"zeros in the complex plane of {variable!r} need numbers for {listing(others)}: "
            f"chain.fix({', '.join(f'{name}=…' for name in others)})"
        )
    weighed = [term.name for term in chain.terms if term.role == "weight" and variable in term.parameters]
    if weighed:
        raise NotApplicable(
            f"{variable!r} is a Boltzmann factor in the weight {weighed[0]}, and zeros are sought in parameters of "
            f"energies; declare {variable} = exp(beta*mu) by an energy, -mu*n for {variable}**n, and ask for "
            'variable="mu": what is found is then z, which is this factor or a power of it'
        )


def polynomial_of(chain: Chain, variable: str, table: Counts) -> tuple[Fugacity, MixedTerms]:
    """Return the partition function as a polynomial in z and the y, up to a power of z and a positive factor.

    Parameters
    ----------
    table : Counts
        By "energy", with nothing free but the variable.
    """
    if variable == "T":
        step, levels = _lattice([key[0] for key in table], "the energy")
        return Fugacity("T", step, ()), {(k,): n for k, n in zip(levels, table.values(), strict=True)}
    slope = f"dE/d{variable}"
    if slope not in table.names:
        raise ParameterError(f"no energy of this chain depends on {variable!r}, so that Z has no zeros in it")
    place = table.names.index(slope)
    step, levels = _lattice([key[place] for key in table], slope)
    rest = [classes(key[0]) if place else {} for key in table]
    beta, others, rates = None, [], []
    for constant in dict.fromkeys(c for parts in rest for c in parts):
        width, powers = _lattice([parts.get(constant, Fraction(0)) for parts in rest], "the energy")
        if any(powers):
            beta = beta or inverse_temperature(chain, variable)
            others.append(powers)
            rates.append(beta * width * constant)
    terms: dict[tuple[int, ...], int] = {}
    for key, n in zip(zip(levels, *others, strict=True), table.values(), strict=True):
        terms[key] = terms.get(key, 0) + n
    return Fugacity(variable, step, tuple(rates)), terms


def inverse_temperature(chain: Chain, variable: str) -> Fraction:
    """Return β, which the energies beside the variable need."""
    value = chain.fixed.get("T")
    if not isinstance(value, Fraction) or value <= 0:
        raise ParameterError(
            f"besides {variable!r} this chain has energies, whose Boltzmann factors need a temperature above 0: "
            "chain.fix(T=…)"
        )
    return 1 / value


def classes(value: Any) -> dict[Any, Fraction]:
    """Return the rational multiples of 1 and of irrational constants that add up to a value."""
    if isinstance(value, (int, Fraction)):
        return {1: Fraction(value)}
    import sympy as sp

    parts: dict[Any, Fraction] = {}
    for summand in sp.Add.make_args(sp.expand(value)):
        number, key = summand.as_coeff_Mul(rational=True)
        constant = 1 if key == 1 else key
        parts[constant] = parts.get(constant, Fraction(0)) + Fraction(int(number.p), int(number.q))
    return parts


def _lattice(values: Sequence[Any], what: str) -> tuple[Fraction, list[int]]:
    """Return the greatest step of a lattice that holds all values, and their places on it from the least one."""
    exact = []
    for value in values:
        if not isinstance(value, (int, Fraction)):
            raise NotApplicable(
                f"{what} takes the irrational value {value}, so that Z is no polynomial in one variable"
            )
        exact.append(Fraction(value))
    low = min(exact)
    denominator = math.lcm(*((value - low).denominator for value in exact))
    step = Fraction(math.gcd(*(int((value - low) * denominator) for value in exact)), denominator) or Fraction(1)
    return step, [int((value - low) / step) for value in exact]


def numeric_coefficients(terms: MixedTerms, rates: Sequence[Any]) -> Coefficients:
    """Return a function that evaluates the coefficients of z at the numbers y = exp(−rate), with error bounds."""

    def evaluate() -> tuple[list[Any], list[Any]]:
        import mpmath as mp

        exponents = [_real(rate) for rate in rates]
        values = [mp.mpf(0)] * (max(powers[0] for powers in terms) + 1)
        errors = list(values)
        for powers, c in terms.items():
            parts = [power * e for power, e in zip(powers[1:], exponents, strict=True)]
            size = mp.exp(-mp.fsum(parts)) if parts else mp.mpf(1)
            values[powers[0]] += c * size
            # Roundings of the exponent, the exponential, the product and the sum.
            errors[powers[0]] += abs(c) * size * (mp.fsum(map(abs, parts)) + 8 + len(terms))
        unit = mp.ldexp(1, 2 - mp.mp.prec)
        return values, [error * unit for error in errors]

    return evaluate


def _real(rate: Any) -> Any:
    import mpmath as mp

    if isinstance(rate, Fraction):
        return mp.mpf(rate.numerator) / rate.denominator
    return mp.mpf(rate._to_mpmath(mp.mp.prec + 8))
