"""Generating functions Σ Z_N xᴺ as rational functions of x."""

from __future__ import annotations

from fractions import Fraction
from typing import TYPE_CHECKING, Any

from ...assemble.window import build_window
from ...declare.chain import Chain
from ...errors import NotApplicable, ParameterError, SolveError
from ..alphabet import Laurent
from ..closed import ClosedForm
from ..deadline import TimeUp, limited
from ..forms import closed_form
from ..open_ends import open_sum
from ..pieces import check_boundary, runs
from ..polynomials import Coefficients
from ..report import long_sum
from ..spectrum import Factor, Spectrum

if TYPE_CHECKING:
    from collections.abc import Sequence

__all__ = ["generating_function"]

#: Sums with more terms are written out in exponentials.
_READABLE = 12


def generating_function(source: ClosedForm | Chain, x: Any = "x", boundary: str = "ring") -> Any:
    """Return Σ Z_N xᴺ over all N ≥ 1 as a rational function of x, symbolic in Boltzmann factors.

    With P(λ) = det(λ − M) = Σ a_k λⁿ⁻ᵏ the rings give −x D'(x)/D(x), D(x) = Σ a_k xᵏ, written
    factor by factor of P; for open chains the numerator belongs to the first few Z_N and the
    denominator to the minimal polynomial. No eigenvalue is needed.

    Parameters
    ----------
    source : ClosedForm or Chain
        From `closed_form`, whose time limit holds here too.
    x : str or sympy Symbol
        The variable.
    boundary : str
        ``"ring"`` or ``"open"``. For rings that are shorter than their longest term the
        coefficient is the trace of Mᴺ, that is, their sites are still taken modulo N.

    Returns
    -------
    sympy expression

    Raises
    ------
    NotApplicable
        The characteristic polynomial was not found in time.

    Examples
    --------
    >>> from tmsolve import Chain, bond, colours, delta
    >>> potts = Chain(colours(3), [bond(lambda s, t, J: -J*delta(s, t))]).fix(J=0)
    >>> generating_function(potts)                                      # Σ 3ᴺ xᴺ
    3*x/(1 - 3*x)
    """
    form = closed_form(source) if isinstance(source, Chain) else source
    if not isinstance(form, ClosedForm):
        raise ParameterError(f"generating_function takes a chain or the result of closed_form, got {source!r}")
    variable = _variable(x, form)
    ring = check_boundary(boundary)
    if not form.spectrum.factors:
        raise NotApplicable(f"the generating function needs the characteristic polynomial, and {form.why}")
    try:
        return limited(form.time_limit, _of_rings if ring else _of_open_chains, form, variable)
    except TimeUp:
        raise SolveError(
            f"the generating function was not finished within {form.time_limit:g} s; fix parameters with "
            "chain.fix(…), or give closed_form a longer time_limit"
        ) from None


def _variable(x: Any, form: ClosedForm) -> Any:
    import sympy as sp

    symbol = sp.Symbol(x) if isinstance(x, str) and x.isidentifier() else x
    if not isinstance(symbol, sp.Symbol):
        raise ParameterError(f'x is a name such as "x" or a sympy Symbol, got {x!r}')
    if symbol.name in (*form.chain.free, "beta"):
        raise ParameterError(f"{symbol.name!r} is a symbol of this chain already; give the variable another name")
    return symbol


def _of_rings(form: ClosedForm, x: Any) -> Any:
    import sympy as sp

    spectrum = form.spectrum
    return sp.Add(*(factor.multiplicity * _ring_part(spectrum, factor, x) for factor in _moving(spectrum)))


def _moving(spectrum: Spectrum) -> list[Factor]:
    return [factor for factor in spectrum.factors if not factor.is_zero]


def _ring_part(spectrum: Spectrum, factor: Factor, x: Any) -> Any:
    import sympy as sp

    written = [_written(spectrum, spectrum.matrix.laurent(c, k)) for k, c in enumerate(factor.polynomial)]
    above = sp.Add(*(-k * c * x**k for k, c in enumerate(written)))
    return above / sp.Add(*(c * x**k for k, c in enumerate(written)))


def _of_open_chains(form: ClosedForm, x: Any) -> Any:
    import sympy as sp

    spectrum = form.spectrum
    matrix = spectrum.matrix
    window = build_window(form.chain)
    missing = 1
    while not any(piece is window for piece, _ in runs(window, missing, ring=False)):
        missing += 1
    # From so many cells on the root 0 has died out; a remainder that vanishes as long again is no remainder.
    settled = missing + matrix.size
    sums = [{}, *(open_sum(form.chain, matrix, cells) for cells in range(1, settled + matrix.size + 1))]
    below, above = _shortest(spectrum, sums, settled)
    top = sp.Add(*(_written(spectrum, c) * x**k for k, c in enumerate(above) if c))
    return top / sp.Add(*(_written(spectrum, c) * x**k for k, c in enumerate(below)))


def _shortest(spectrum: Spectrum, sums: list[Laurent], settled: int) -> tuple[list[Laurent], list[Laurent]]:
    """Return the denominator with no more factors than needed, and the numerator."""
    matrix = spectrum.matrix

    def trial(factors: list[Factor]) -> tuple[list[Laurent], list[Laurent]] | None:
        total: Coefficients = (matrix.alphabet.ring.one,)
        for factor in factors:
            total = _times(total, factor.polynomial, matrix.alphabet.ring.zero)
        below = [matrix.laurent(c, k) for k, c in enumerate(total)]
        above = [_convolution(below, sums, k) for k in range(len(sums))]
        return None if any(above[settled:]) else (below, above)

    kept = _moving(spectrum)
    if trial(kept) is None:
        # An eigenvalue that is not semisimple needs its factor more than once.
        kept = [factor for factor in kept for _ in range(factor.multiplicity)]
    for factor in list(kept):
        without = [other for other in kept if other is not factor]
        if trial(without) is not None:
            kept = without
    found = trial(kept)
    assert found is not None, "a sequence u Mᵏ v obeys the characteristic polynomial of M"
    return found


def _times(first: Coefficients, second: Coefficients, zero: Any) -> Coefficients:
    result = [zero] * (len(first) + len(second) - 1)
    for i, a in enumerate(first):
        for j, b in enumerate(second):
            result[i + j] = result[i + j] + a * b
    return tuple(result)


def _convolution(first: Sequence[Laurent], second: Sequence[Laurent], index: int) -> Laurent:
    total: dict[tuple[Fraction, ...], Fraction] = {}
    for k, a in enumerate(first[: index + 1]):
        for powers, c in a.items():
            for others, d in second[index - k].items():
                key = tuple(p + q for p, q in zip(powers, others, strict=True))
                total[key] = total.get(key, Fraction(0)) + c * d
    return {key: c for key, c in total.items() if c}


def _written(spectrum: Spectrum, laurent: Laurent) -> Any:
    return spectrum.writer.write(laurent) if len(laurent) <= _READABLE else long_sum(spectrum, laurent)
