"""The second largest modulus among the eigenvalues, as far as it can be told for all parameters."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from .alphabet import Laurent
from .field_text import write_quotient
from .spectrum import Factor, Spectrum

__all__ = ["correlation_length"]


def correlation_length(spectrum: Spectrum, eigenvalues: Sequence[tuple[Any, int]]) -> Any:
    """Return −1/ln(|λ₂|/λ₁) in cells; 0 when every other eigenvalue vanishes."""
    import sympy as sp

    first, multiplicity = eigenvalues[0]
    if multiplicity > 1:
        return sp.oo
    dominated = _dominated(spectrum, first)
    ratios = [
        _ratio(spectrum, value, first) for value, _ in eigenvalues[1:] if value != 0 and value not in dominated
    ]
    if not ratios:
        return sp.Integer(0)
    return -1 / sp.log(ratios[0] if len(ratios) == 1 else sp.Max(*ratios, evaluate=False))


def _dominated(spectrum: Spectrum, first: Any) -> set[Any]:
    """Return eigenvalues whose modulus is nowhere the second largest, for reasons of sign alone."""
    found: set[Any] = set()
    for factor in spectrum.factors:
        # Of t/2 ± s the root with the sign of t is the larger one, or they are conjugate.
        sign = _sign(_trace(spectrum, factor))
        if factor.degree == 2 and factor.roots and sign and first not in factor.roots:
            found.add(factor.roots[1 if sign == 1 else 0])
    rivals = [(f.roots[0], _trace(spectrum, f)) for f in spectrum.factors if f.degree == 1 and f.roots]
    rivals = [(value, trace) for value, trace in rivals if value != first]
    for small, a in rivals:
        for large, b in rivals:
            if large is not small and _sign(_plus(b, a)) == 1 == _sign(_plus(b, a, -1)):
                found.add(small)
    return found


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


def _ratio(spectrum: Spectrum, value: Any, first: Any) -> Any:
    """Return |value|/first."""
    import sympy as sp

    traces = {f.roots[0]: _trace(spectrum, f) for f in spectrum.factors if f.degree == 1 and f.roots}
    if value in traces and first in traces:
        ratio = write_quotient(spectrum.writer, traces[value], traces[first]).build()
        sign = _sign(traces[value])
        return ratio * sign if sign else sp.Abs(ratio, evaluate=False)
    return sp.Abs(value, evaluate=False) / first
