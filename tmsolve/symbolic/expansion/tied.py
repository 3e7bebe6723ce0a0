"""Low temperature where classes of ground states tie: from the characteristic polynomial."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..jet import Jet
from ..polynomials import berkowitz, characteristic
from .balance import Balanced
from .laurent import Laurent
from .matrix import Constants, Part, source_parts
from .numbers import NumberField
from .perturb import Index, logarithm
from .puiseux import Branch, Rung, value_at

__all__ = ["TiedSeries", "tied_series"]


@dataclass(frozen=True, eq=False)
class TiedSeries:
    """ln(λ/ρ) and its derivatives by sources, in powers of t = x^(1/ramification).

    Attributes
    ----------
    constants : Constants
        Ring of the coefficients.
    ramification : int
    logs : dict
        Coefficients by power of t and of the sources.
    gap : int
        Least power of t in ln(λ/ρ).
    """

    constants: Constants
    ramification: int
    logs: dict[Index, Any]
    gap: int


def tied_series(balanced: Balanced, field: NumberField, start: Any, sources: int, order: int) -> TiedSeries:
    """Expand about a multiple root of the ground states' matrix.

    Parameters
    ----------
    balanced : Balanced
        Matrix in powers of x.
    field, start : NumberField, element
        The growth factor ρ.
    sources : int
        How many observables have one.
    order : int
        Powers of t up to ``order`` times the first one in ln λ.
    """
    polynomial = _polynomial(balanced, field, sources)
    constants = Constants(balanced.matrix, field)
    plain = [{k: constants.number(c) for k, c in rung.items()} for rung in polynomial[0, 0]]
    branch = Branch(field, plain, start)
    gap = _first_power(branch)
    reach = order * gap + 1
    logs: dict[Index, Any] = {}
    final = Constants(balanced.matrix, branch.field)
    value = branch.series(reach)
    root = value.terms[0]
    moved = {(k, 0, 0): final.zero + c for k, c in value.terms.items() if k}
    indices = [(k, 0, 0) for k in range(1, reach)]
    logs.update(logarithm(indices, moved, root, branch.field, final.zero))
    if sources:
        lifted = {part: _lifted(rungs, branch, field, final) for part, rungs in polynomial.items()}
        for part, series in _slopes(lifted, branch, final, sources, reach).items():
            logs.update({(k, *part): c for k, c in series.terms.items()})
    return TiedSeries(final, branch.ramification, logs, gap)


def _first_power(branch: Branch) -> int:
    if len(branch.head) > 1:
        return branch.head[1][1]
    reach = 2
    while len(branch.series(reach).terms) == 1:
        reach *= 2
    return min(k for k in branch.series(reach).terms if k)


def _polynomial(balanced: Balanced, field: NumberField, sources: int) -> dict[Part, list[Rung]]:
    """Return the characteristic polynomial, to first order in the sources, by powers of z and x."""
    import sympy as sp
    from sympy.polys.orderings import lex
    from sympy.polys.rings import PolyRing

    rational = Constants(balanced.matrix, NumberField())
    inner = [] if rational.ring is None else list(rational.ring.symbols)
    ring = PolyRing([sp.Symbol("x"), *inner], sp.QQ, lex)
    size = balanced.matrix.size
    cells: dict[Part, np.ndarray] = {}
    for part, i, j, power, exponents, c in balanced.exponents:
        table = cells.setdefault(part, np.full((size, size), None, dtype=object))
        element = rational.coefficient(exponents, c)
        terms = {(): element} if rational.ring is None else dict(element.terms())
        table[i, j] = (table[i, j] or ring.zero) + ring.from_dict({(power, *k): v for k, v in terms.items()})
    entries = np.empty((size, size), dtype=object)
    for i, j in np.ndindex(size, size):
        jet = [cells[part][i, j] or ring.zero if part in cells else ring.zero for part in source_parts(2)]
        entries[i, j] = Jet(*jet) if sources else jet[0]
    if sources:
        found = [jet.parts() for jet in berkowitz(entries, Jet(ring.one, ring.zero, ring.zero, ring.zero))]
    else:
        found = [(c,) for c in characteristic(entries, ring)]
    constants = Constants(balanced.matrix, field)
    return {
        part: [_by_power(parts[k] if k < len(parts) else ring.zero, constants) for parts in reversed(found)]
        for k, part in enumerate(source_parts(sources))
    }


def _by_power(element: Any, constants: Constants) -> Rung:
    rung: Rung = {}
    for (k, *powers), c in element.terms():
        number = constants.field.domain.convert(c)
        term = number if constants.ring is None else constants.ring.from_dict({tuple(powers): number})
        rung[k] = rung[k] + term if k in rung else term
    return {k: c for k, c in rung.items() if c}


def _lifted(rungs: Sequence[Rung], branch: Branch, field: NumberField, final: Constants) -> list[Rung]:
    """Return a polynomial over the branch's field, in powers of its t."""

    def lift(c: Any) -> Any:
        if final.ring is None:
            return field.lift(c, branch.field, branch.image)
        return final.ring.from_dict({k: field.lift(x, branch.field, branch.image) for k, x in c.terms()})

    return [{k * branch.ramification: lift(c) for k, c in rung.items()} for rung in rungs]


def _slopes(
    polynomial: dict[Part, list[Rung]], branch: Branch, constants: Constants, sources: int, reach: int
) -> dict[Part, Laurent]:
    """Return ∂ ln z/∂φ, ∂ ln z/∂ψ and ∂² ln z/∂φ∂ψ at the root.

    Dividing by ∂P/∂z loses powers, so that the root is taken further until enough of them remain.
    """
    ahead = reach + 1
    while True:
        found = _slopes_to(polynomial, branch, constants, sources, ahead)
        lacking = max(reach - series.reach for series in found.values())
        if lacking <= 0:
            return {part: series.cut(reach) for part, series in found.items()}
        ahead += lacking


def _slopes_to(
    polynomial: dict[Part, list[Rung]], branch: Branch, constants: Constants, sources: int, ahead: int
) -> dict[Part, Laurent]:
    root = branch.series(ahead)
    field = constants.field

    def at(part: Part, times: int = 0) -> Laurent:
        rungs: Sequence[Rung] = polynomial[part]
        for _ in range(times):
            rungs = [{k: c * field.number(i) for k, c in rung.items()} for i, rung in enumerate(rungs)][1:]
        return value_at(rungs, root)

    one = field.domain.one
    slope = _numbers(at((0, 0), 1), constants)
    below = -slope.inverse(one) if slope.terms else slope
    if not slope.terms:
        return {(1, 0): Laurent({}, slope.reach - ahead)}
    inverse = root.inverse(one)
    by_a = at((1, 0)) * below
    found = {(1, 0): by_a * inverse}
    if sources > 1:
        by_b = at((0, 1)) * below
        both = at((1, 1)) + at((1, 0), 1) * by_b + at((0, 1), 1) * by_a + at((0, 0), 2) * by_a * by_b
        found[0, 1] = by_b * inverse
        found[1, 1] = both * below * inverse - by_a * by_b * inverse * inverse
    return found


def _numbers(series: Laurent, constants: Constants) -> Laurent:
    return Laurent({k: constants.number(c) for k, c in series.terms.items()}, series.reach)
