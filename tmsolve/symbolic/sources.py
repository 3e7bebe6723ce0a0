"""Means and susceptibilities: how the Perron root moves when a source is added.

A source −φ a in the energy multiplies weights by exp(β φ a). The characteristic polynomial
P(μ; φ, ψ) to first order in each of two sources gives, at its largest root,

    ∂μ/∂φ = −P_φ/P_μ,   ∂²μ/∂φ∂ψ = −(P_φψ + P_φμ μ_ψ + P_ψμ μ_φ + P_μμ μ_φ μ_ψ)/P_μ,

so that nothing but polynomials is differentiated, and the source may break every symmetry.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..declare.chain import Chain
from ..symmetry.refine import class_members, equitable
from ..tabulate.colours import numbers_of_colours
from .blocks import Block, components
from .colours.matrix import ColourMatrix, tilted_colour_matrix
from .field import Element, Poly, RootField, derivative
from .field_text import FieldWriter
from .jet import Jet
from .matrix import SymbolicMatrix, tilted_matrix
from .permutations import numbered
from .polynomials import berkowitz, factors
from .readable import Writer
from .spectrum import Factor, Spectrum, larger_factor

__all__ = ["mean_element", "response_element"]


@dataclass(frozen=True)
class _Tilted:
    """The field of the largest root, and derivatives of P there as numerators of that field.

    ``value[i]``, ``slope[i]`` are the i-th part (P, P_φ, P_ψ, P_φψ) and its derivative by μ;
    ``curve`` is P_μμ; ``below`` are the denominators that make up P_μ.
    """

    field: RootField
    writer: FieldWriter
    value: tuple[Poly, ...]
    slope: tuple[Poly, ...]
    curve: Poly
    below: tuple[Poly, ...]


def mean_element(chain: Chain, name: str, eigenvalue: Any, spectrum: Spectrum) -> tuple[FieldWriter, Element]:
    """Return ∂ ln λ/∂φ for the source φ of an observable: its mean per cell.

    Parameters
    ----------
    chain : Chain
        The chain.
    name : str
        One of its observables.
    eigenvalue : sympy expression
        The Perron root, for results that cannot be freed of it.
    spectrum : Spectrum
        Of the matrix without sources; a root that it knows is written the same way.
    """
    tilted = _tilted(chain, (name,), eigenvalue, spectrum)
    field = tilted.field
    return tilted.writer, field.negative(field.over(tilted.value[1], *tilted.below, field.mu))


def response_element(
    chain: Chain, first: str, second: str, eigenvalue: Any, spectrum: Spectrum
) -> tuple[FieldWriter, Element]:
    """Return ∂² ln λ/∂φ∂ψ for the sources of two observables: the sum of their connected correlations."""
    tilted = _tilted(chain, (first, second), eigenvalue, spectrum)
    field = tilted.field
    by_a, by_b = (field.negative(field.over(tilted.value[i], *tilted.below)) for i in (1, 2))
    both = field.product(by_a, by_b)
    parts = [
        Element(tilted.value[3]),
        field.product(Element(tilted.slope[1]), by_b),
        field.product(Element(tilted.slope[2]), by_a),
        field.product(Element(tilted.curve), both),
    ]
    one = field.embed((field.ring.one,))
    relative = field.product(field.total(parts), field.negative(field.over(one, *tilted.below, field.mu)))
    square = field.product(both, field.over(one, field.mu, field.mu))
    return tilted.writer, field.total([relative, field.negative(square)])


def _tilted(chain: Chain, names: Sequence[str], eigenvalue: Any, spectrum: Spectrum) -> _Tilted:
    matrix = tilted_colour_matrix(chain, *names) if numbers_of_colours(chain) else tilted_matrix(chain, *names)
    ring = matrix.alphabet.ring
    writer = spectrum.writer if _same_symbols(matrix, spectrum.matrix) else Writer(matrix.alphabet)
    factor, jets, others = _leading(matrix, writer, _lumped(matrix, keep_sources=len(names) > 1))
    field = RootField(factor.polynomial, ring)
    known = _known(factor, matrix, spectrum)
    block = known.block.matrix if known.degree == known.block.size == 2 else None
    parts = [[jet.parts()[i] for jet in reversed(jets)] for i in range(4)]
    # P = F G gives P_μ = F_μ G at a simple root of F.
    below = [field.slope]
    for other, multiplicity in others:
        key = field.denominator(field.embed(tuple(reversed(other))), len(other) - 1)
        below.extend([key] * multiplicity)
    return _Tilted(
        field,
        FieldWriter(field, matrix, writer, eigenvalue, block),
        tuple(field.embed(part) for part in parts),
        tuple(field.embed(derivative(part)) for part in parts),
        field.embed(derivative(derivative(parts[0]))),
        tuple(below),
    )


def _same_symbols(a: SymbolicMatrix, b: SymbolicMatrix) -> bool:
    return (a.alphabet.classes, a.alphabet.units) == (b.alphabet.classes, b.alphabet.units)


def _known(factor: Factor, matrix: SymbolicMatrix, spectrum: Spectrum) -> Factor:
    """Return the same factor of the matrix without sources, whose block the root was written with."""
    if not _same_symbols(matrix, spectrum.matrix) or matrix.scale != spectrum.matrix.scale:
        return factor
    return next((f for f in spectrum.factors if f.polynomial == factor.polynomial), factor)


def _leading(matrix: SymbolicMatrix, writer: Writer, lumped: np.ndarray) -> tuple[Factor, Any, list]:
    """Return the factor with the largest root, the characteristic polynomial it divides, and the other factors."""
    ring = matrix.alphabet.ring
    best = None
    for part in components(Block(lumped, "", positive=True), _value):
        jets = berkowitz(part.matrix, Jet(ring.one, ring.zero, ring.zero, ring.zero))
        block = Block(_each_value(part.matrix), "", positive=True)
        found = factors(tuple(jet.x for jet in jets), ring)
        for polynomial, _, _ in found:
            factor = Factor(polynomial, block, 1, 1)
            if best is None or _larger(matrix, writer, factor, best[0]):
                best = factor, jets, [(p, m) for p, m, _ in found if p != polynomial]
    assert best is not None
    return best


def _value(jet: Jet) -> bool:
    return bool(jet.x)


def _larger(matrix: SymbolicMatrix, writer: Writer, new: Factor, old: Factor) -> bool:
    return larger_factor(Spectrum(matrix, writer, factors=(old, new)), 0, 1) == 1


def _lumped(matrix: SymbolicMatrix, keep_sources: bool) -> np.ndarray:
    """Average the matrix over states that counting weights cannot tell apart.

    To first order the classes of the unperturbed matrix are enough, because its Perron vectors
    are constant on them; to second order the classes must be those with the sources too.
    """
    entries = matrix.entries
    if isinstance(matrix, ColourMatrix):
        return entries
    table = numbered(entries) if keep_sources else numbered(_each_value(entries))
    classes = class_members(equitable(table))
    domain = matrix.alphabet.ring.domain
    lumped = np.empty((len(classes), len(classes)), dtype=object)
    for a, rows in enumerate(classes):
        for b, columns in enumerate(classes):
            total: Any = entries[np.ix_(rows, columns)].sum()
            lumped[a, b] = total.over(domain(len(columns)))
    return lumped


def _each_value(entries: np.ndarray) -> np.ndarray:
    values = np.empty(entries.shape, dtype=object)
    for index in np.ndindex(entries.shape):
        entry: Any = entries[index]
        values[index] = entry.x
    return values
