"""The second largest modulus among the eigenvalues, as far as it can be told for all parameters."""

from __future__ import annotations

from typing import Any

from .alphabet import Laurent
from .field_text import write_quotient
from .perron import Perron
from .roots import is_reversible, quadratic
from .spectrum import Factor, Spectrum, leading_class

__all__ = ["correlation_length"]


def correlation_length(spectrum: Spectrum, perron: Perron) -> Any:
    """Return −1/ln(|λ₂|/λ₁) in cells; 0 when every other eigenvalue of the leading class vanishes."""
    import sympy as sp

    first = perron.value
    spectrum = leading_class(spectrum, perron.factor)
    rivals = [f for f in spectrum.factors if not f.is_zero and f.roots != (first,)]
    rivals = [f for f in rivals if not any(_dominates(spectrum, other, f) for other in rivals)]
    if not rivals:
        return sp.Integer(0)
    if len(rivals) == 1 and rivals[0].degree == 1 and first in _linear(spectrum):
        ratio = _ratio(spectrum, rivals[0], _linear(spectrum)[first])
        return sp.oo if ratio == 1 else -1 / sp.log(ratio)
    moduli = [modulus for factor in rivals for modulus in _moduli(spectrum, factor, first)]
    second = moduli[0] if len(moduli) == 1 else sp.Max(*moduli, evaluate=False)
    return -1 / sp.log(second / first)


def _linear(spectrum: Spectrum) -> dict[Any, Factor]:
    return {f.roots[0]: f for f in spectrum.factors if f.degree == 1 and f.roots}


def _dominates(spectrum: Spectrum, large: Factor, small: Factor) -> bool:
    """Whether one simple eigenvalue is the larger modulus because all terms of both sum and difference are positive."""
    if large is small or large.degree != 1 or small.degree != 1:
        return False
    a, b = _trace(spectrum, large), _trace(spectrum, small)
    return _sign(_plus(a, b)) == 1 == _sign(_plus(a, b, -1))


def _moduli(spectrum: Spectrum, factor: Factor, first: Any) -> list[Any]:
    """Return expressions for the largest modulus among the roots of a factor, the Perron root left out."""
    rest = [root for root in factor.roots if root != first]
    if len(rest) == 1:
        sign = _sign(_trace(spectrum, factor)) if factor.degree == 1 else 0
        return [rest[0] * sign if sign else _modulus(rest[0])]
    if factor.degree != 2:
        return [_modulus(root) for root in rest]
    return _pair(spectrum, factor)


def _pair(spectrum: Spectrum, factor: Factor) -> list[Any]:
    """Return real expressions whose maximum is the larger modulus of T ± √D, conjugate or not.

    It is |T| + √D for D ≥ 0 and √(T² − D) for D < 0; each is the smaller one where it does not hold.
    """
    import sympy as sp

    matrix = spectrum.matrix
    block = factor.block.matrix if factor.block.size == 2 else None
    form = quadratic(factor.polynomial, matrix, spectrum.writer, block)
    front = sp.Rational(form.front.numerator, form.front.denominator)
    trace_sign = _sign(_trace(spectrum, factor))
    middle = trace_sign * form.middle.build() or sp.Abs(form.middle.build(), evaluate=False)
    inside, outside = form.inside.build(), form.outside.build()
    outside = outside if outside.is_positive else sp.Abs(outside, evaluate=False)
    constant = _root_of_modulus(spectrum.writer.write(matrix.laurent(factor.polynomial[2], 2)))
    if inside.is_negative:
        return [constant]
    if inside.is_positive or is_reversible(matrix):
        return [front * (middle + outside * sp.sqrt(inside))]
    return [front * (middle + outside * sp.sqrt(sp.Max(inside, 0, evaluate=False))), constant]


def _modulus(value: Any) -> Any:
    """Return |value| with numbers in front of the bars."""
    import sympy as sp

    number, rest = value.as_coeff_Mul(rational=True)
    return abs(number) * sp.Abs(rest, evaluate=False)


def _root_of_modulus(value: Any) -> Any:
    """Return √|value|, without a root where the value is a square."""
    import sympy as sp

    powers = [factor.as_base_exp() for factor in sp.Mul.make_args(value)]
    if all(power.is_Integer and power % 2 == 0 for _, power in powers):
        return sp.Mul(*(sp.Abs(base, evaluate=False) ** (power // 2) for base, power in powers))
    return sp.sqrt(sp.Abs(value, evaluate=False))


def _trace(spectrum: Spectrum, factor: Factor) -> Laurent:
    return spectrum.matrix.laurent(-factor.polynomial[1])


def _sign(laurent: Laurent) -> int:
    """Return 1 or −1 where every coefficient has that sign, else 0; Boltzmann factors are positive."""
    if laurent and all(c > 0 for c in laurent.values()):
        return 1
    return -1 if laurent and all(c < 0 for c in laurent.values()) else 0


def _plus(a: Laurent, b: Laurent, sign: int = 1) -> Laurent:
    total = dict(a)
    for x, c in b.items():
        total[x] = total.get(x, 0) + sign * c
    return {x: c for x, c in total.items() if c}


def _ratio(spectrum: Spectrum, factor: Factor, first: Factor) -> Any:
    """Return the modulus of a simple eigenvalue over the Perron root, both being sums of exponentials."""
    import sympy as sp

    trace = _trace(spectrum, factor)
    ratio = write_quotient(spectrum.writer, trace, _trace(spectrum, first)).build()
    sign = _sign(trace)
    return ratio * sign if sign else sp.Abs(ratio, evaluate=False)
