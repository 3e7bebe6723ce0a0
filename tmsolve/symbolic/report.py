"""What a closed form shows of itself: expressions of its parts, text and LaTeX."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import islice
from typing import TYPE_CHECKING, Any

from ..errors import NotApplicable
from .alphabet import Laurent
from .colours.matrix import ColourMatrix
from .multiplicity import factor_text
from .perron import eigenvalue_symbol
from .plain import latex_text, plain_text
from .recurrence import minimal_polynomial
from .spectrum import Spectrum

if TYPE_CHECKING:
    from .forms import ClosedForm

__all__ = [
    "cells_symbol",
    "latex",
    "long_sum",
    "matrix",
    "polynomial",
    "reason",
    "recurrence",
    "ring_latex",
    "ring_text",
    "text",
]

#: Sums with more terms are written out in exponentials without looking for a shorter form.
_READABLE_TERMS = 12
#: Longer formulas are named, not printed, in the text form.
_PRINTED_LETTERS, _PRINTED_PARTS = 1500, 1500
#: In a longer Z_N eigenvalues are named.
_NAMED_LETTERS = 500


def matrix(spectrum: Spectrum) -> Any:
    """Return the transfer matrix as a sympy Matrix."""
    import sympy as sp

    source = spectrum.matrix
    if isinstance(source, ColourMatrix):
        raise NotApplicable(
            f"the transfer matrix of {source.number} colours has {source.rows} rows, a symbol; use .blocks, whose "
            f"matrices hold polynomials in {source.number}, or give a number of colours"
        )
    write = {}
    for entry in source.entries.ravel():
        if entry not in write:
            write[entry] = long_sum(spectrum, source.laurent(entry))
    return sp.ImmutableMatrix(source.size, source.size, lambda i, j: write[source.entries[i, j]])


def cells_symbol() -> Any:
    """Return the symbol N."""
    import sympy as sp

    return sp.Symbol("N", integer=True, positive=True)


def long_sum(spectrum: Spectrum, laurent: Laurent) -> Any:
    """Write a sum: expanded exponentials."""
    return spectrum.writer.plain(laurent).build()


def _coefficient(spectrum: Spectrum, laurent: Laurent) -> Any:
    if len(laurent) > _READABLE_TERMS:
        return long_sum(spectrum, laurent)
    return spectrum.writer.write(laurent)


def polynomial(spectrum: Spectrum) -> Any:
    """Return the characteristic polynomial as a product of powers of factors."""
    import sympy as sp

    root = eigenvalue_symbol()
    product = sp.Integer(1)
    for factor in spectrum.factors:
        coefficients = [_coefficient(spectrum, spectrum.matrix.laurent(c, k)) for k, c in enumerate(factor.polynomial)]
        one = sp.Add(*(c * root ** (factor.degree - k) for k, c in enumerate(coefficients)))
        product *= one**factor.multiplicity
    return product


def recurrence(spectrum: Spectrum) -> tuple[Any, ...]:
    """Return c₁, c₂, … of Z_N = Σ c_k Z_{N−k}."""
    minimal = minimal_polynomial(spectrum)
    return tuple(_coefficient(spectrum, spectrum.matrix.laurent(-c, k)) for k, c in enumerate(minimal) if k > 0)


def reason(spectrum: Spectrum) -> str:
    """Say how far the derivation went."""
    if spectrum.is_solved and not spectrum.notes:
        return "every eigenvalue is written by radicals"
    if not spectrum.factors:
        reached = "only the matrix is known"
    elif all(f.irreducible for f in spectrum.factors):
        reached = "implicit form: the factored characteristic polynomial and the recurrence of Z_N are known"
    else:
        reached = "recurrence: the characteristic polynomial is known, unfactored, and with it the recurrence of Z_N"
    return "; ".join((*spectrum.notes, reached))


def text(form: ClosedForm) -> str:
    """Return the readable text of a closed form."""
    import sympy as sp

    size = plain_text(sp.sympify(form.spectrum.matrix.rows))
    fixed = form.chain.fixed.get("T")
    beta = "beta = 1/T" if fixed is None else f"T = {fixed}"
    lines = [f"{form.chain.name}: transfer matrix {size} x {size}; {beta}{_validity(form.spectrum)}"]
    if form.is_closed:
        lines += _closed_lines(form)
    else:
        lines.append(f"  no closed form: {form.why}")
        if form.spectrum.factors:
            lines.append(f"  det(lambda - M) = {_shown(form.characteristic_polynomial)}")
            lines += _recurrence_lines(form)
    if len(form.blocks) > 1:
        lines.append("  blocks")
        lines += [f"    {b.size} x {b.size}, {_times(b.multiplicity)} times: {b.label}" for b in form.blocks]
    return "\n".join(lines)


def _closed_lines(form: ClosedForm) -> list[str]:
    """Return Z_N, the eigenvalues and f; long eigenvalues are written once and named elsewhere."""
    ring, energy = ring_text(form), plain_text(form.free_energy)
    listed = [f"{plain_text(value)}  ({_times(m)})" for value, m in form.eigenvalues]
    if len(ring) > _NAMED_LETTERS:
        names = [f"lambda_{k}" for k in range(1, len(listed) + 1)]
        named = zip(names, form.eigenvalues, strict=True)
        ring = _sum_of_powers([(name, m) for name, (value, m) in named if value != 0])
        listed = [f"{name} = {line}" for name, line in zip(names, listed, strict=True)]
        first = form.eigenvalues[0][0]
        energy = energy.replace(plain_text(first), names[0]) if first.args else energy
    return [f"  Z_N = {ring}", "  eigenvalues (multiplicity)", *(f"    {line}" for line in listed), f"  f = {energy}"]


def _times(multiplicity: Any) -> str:
    return str(multiplicity) if isinstance(multiplicity, int) else plain_text(multiplicity)


def _validity(spectrum: Spectrum) -> str:
    """Say for which numbers of colours all eigenvalues listed are there."""
    matrix = spectrum.matrix
    return f"; {matrix.number} whole, at least {matrix.least}" if isinstance(matrix, ColourMatrix) else ""


def _recurrence_lines(form: ClosedForm) -> list[str]:
    count = len(form.recurrence)
    lines = [f"  Z_N = sum of c_k Z_(N-k), k = 1 ... {count}, for N > {count}"]
    return lines + [f"    c_{k} = {_shown(c)}" for k, c in enumerate(form.recurrence, start=1)]


def _shown(expr: Any) -> str:
    import sympy as sp

    # Printing a long formula takes longer than deriving it.
    if sum(1 for _ in islice(sp.preorder_traversal(expr), _PRINTED_PARTS)) < _PRINTED_PARTS:
        written = plain_text(expr)
        if len(written) <= _PRINTED_LETTERS:
            return written
    return f"({len(expr.args)} terms, too long to be shown; see the attribute of the form)"


def ring_text(form: ClosedForm) -> str:
    """Write Z_N with the largest eigenvalue first."""
    return _sum_of_powers([(_base(value), m) for value, m in form.eigenvalues if value != 0])


def _base(value: Any) -> str:
    """Return an eigenvalue as what can be raised to a power; nothing for 1."""
    if value == 1:
        return ""
    text = plain_text(value)
    return text if (value.is_Atom and not value.is_negative) or value.is_Function else f"({text})"


def _sum_of_powers(terms: Sequence[tuple[str, Any]]) -> str:
    parts = []
    for base, m in terms:
        factors = [] if m == 1 else [factor_text(m, _times(m))]
        factors += [f"{base}**N"] if base else []
        parts.append("*".join(factors) or "1")
    return " + ".join(parts)


def latex(form: ClosedForm) -> str:
    """Return the LaTeX of Z_N, or of the characteristic polynomial where there is no closed form."""
    if not form.is_closed:
        if not form.spectrum.factors:
            return f"$\\text{{{form.why}}}$"
        return f"$\\displaystyle \\det(\\lambda - M) = {latex_text(form.characteristic_polynomial)}$"
    return f"$\\displaystyle Z_{{N}} = {ring_latex(form)}$"


def ring_latex(form: ClosedForm) -> str:
    """Write Z_N as LaTeX without dollar signs, the largest eigenvalue first."""
    parts = []
    for value, m in form.eigenvalues:
        if value != 0:
            factors = [] if m == 1 else [factor_text(m, str(m) if isinstance(m, int) else latex_text(m))]
            factors += [] if value == 1 else [f"\\left({latex_text(value)}\\right)^{{N}}"]
            parts.append(" ".join(factors) or "1")
    return " + ".join(parts)
