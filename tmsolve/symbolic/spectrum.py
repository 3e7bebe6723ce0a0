"""From a symbolic matrix to its blocks, their characteristic polynomials, factors and roots.

Every stage gets a part of the time limit. When one does not finish, what was found before it
is kept and the reason is noted.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from ..errors import NotApplicable
from .blocks import Block, components, merged, split
from .colours.matrix import ColourMatrix
from .deadline import Clock, TimeUp, limited
from .dominance import undominated
from .matrix import SymbolicMatrix
from .multiplicity import both
from .polynomials import Coefficients, characteristic, factors
from .readable import Writer
from .roots import is_reversible, radicals
from .verify import generic_points, number_value, symbol_values

__all__ = ["Factor", "Spectrum", "larger_factor", "leading_class", "leading_factor", "solve_spectrum"]

#: Parts of the remaining time that stages may use; without a characteristic polynomial nothing follows.
_BLOCKS, _POLYNOMIALS, _FACTORS, _ROOTS = 0.4, 0.9, 0.5, 0.6


@dataclass(frozen=True, eq=False)
class Factor:
    """A factor of the characteristic polynomial.

    Attributes
    ----------
    polynomial : Coefficients
        Monic in the root without the scale of the matrix.
    block : Block
        Where it comes from.
    multiplicity : int or sympy expression
        How often it divides the characteristic polynomial of the whole matrix; a polynomial where
        the number of colours is a symbol.
    leading : int
        How often it divides those of the blocks that can carry the Perron root.
    homes : tuple of Block
        These blocks.
    irreducible : bool
        Whether it is known not to factor further.
    roots : tuple of sympy expressions
        Its eigenvalues; empty when there is no form by radicals.
    """

    polynomial: Coefficients
    block: Block
    multiplicity: Any
    leading: int
    irreducible: bool = True
    roots: tuple[Any, ...] = ()
    homes: tuple[Block, ...] = ()

    @property
    def degree(self) -> int:
        """Number of its roots."""
        return len(self.polynomial) - 1

    @property
    def is_zero(self) -> bool:
        """Whether its root is 0."""
        return self.degree == 1 and not self.polynomial[1]


@dataclass(frozen=True, eq=False)
class Spectrum:
    """What is known about the eigenvalues of a symbolic matrix.

    Attributes
    ----------
    matrix : SymbolicMatrix
        The matrix.
    writer : Writer
        Writes its sums of exponentials.
    blocks : tuple of Block
        Its blocks, equal ones counted.
    factors : tuple of Factor
        Factors of the characteristic polynomial; empty when that is not known.
    notes : tuple of str
        What did not succeed, and why.
    """

    matrix: SymbolicMatrix
    writer: Writer
    blocks: tuple[Block, ...] = ()
    factors: tuple[Factor, ...] = ()
    notes: tuple[str, ...] = field(default=())

    def note(self, text: str) -> Spectrum:
        """Return the same spectrum with one more reason."""
        return replace(self, notes=(*self.notes, text))

    def symmetric_part(self) -> Spectrum:
        """Return what belongs to the blocks that can carry the Perron root."""
        factors = (replace(f, multiplicity=f.leading) for f in self.factors if f.leading)
        return replace(self, blocks=tuple(b for b in self.blocks if b.positive), factors=tuple(factors))

    @property
    def is_solved(self) -> bool:
        """Whether every eigenvalue has an expression."""
        return bool(self.factors) and all(f.is_zero or f.roots for f in self.factors)


def solve_spectrum(matrix: SymbolicMatrix, clock: Clock) -> Spectrum:
    """Go as far as the time allows: blocks, characteristic polynomials, factors, roots."""
    spectrum = Spectrum(matrix, Writer(matrix.alphabet))
    stages: list[tuple[float, str, Callable[[Spectrum], Spectrum]]] = [
        (_BLOCKS, "the search for symmetries", _with_blocks),
        (_POLYNOMIALS, "the characteristic polynomial", _with_polynomials),
        (_FACTORS, "the factorisation of the characteristic polynomial", _with_factors),
        (_ROOTS, "the roots by radicals", _with_roots),
    ]
    for part, what, stage in stages:
        allowed = clock.share(part)
        try:
            spectrum = limited(allowed, stage, spectrum)
        except TimeUp:
            return spectrum.note(f"{what} took longer than the {allowed:.2g} s left for it")
    return spectrum


def _with_blocks(spectrum: Spectrum) -> Spectrum:
    matrix = spectrum.matrix
    blocks = matrix.sectors() if isinstance(matrix, ColourMatrix) else split(matrix.entries, matrix.permutations)
    return replace(spectrum, blocks=tuple(blocks))


def _with_polynomials(spectrum: Spectrum) -> Spectrum:
    ring = spectrum.matrix.alphabet.ring
    found = merged([(block, characteristic(block.matrix, ring)) for block in spectrum.blocks])
    whole = [
        Factor(p, b, b.multiplicity, b.multiplicity if b.positive else 0, irreducible=False, homes=(b,) * b.positive)
        for b, p in found
    ]
    return replace(spectrum, blocks=tuple(block for block, _ in found), factors=tuple(whole))


def _with_factors(spectrum: Spectrum) -> Spectrum:
    ring = spectrum.matrix.alphabet.ring
    found: dict[Coefficients, Factor] = {}
    for whole in spectrum.factors:
        for polynomial, power, irreducible in factors(whole.polynomial, ring):
            first = found.get(polynomial, Factor(polynomial, whole.block, 0, 0, irreducible))
            found[polynomial] = replace(
                first,
                multiplicity=both(first.multiplicity, power * whole.multiplicity),
                leading=first.leading + power * whole.leading,
                homes=(*first.homes, *whole.homes),
            )
    return replace(spectrum, factors=tuple(found.values()))


def _with_roots(spectrum: Spectrum) -> Spectrum:
    matrix = spectrum.matrix
    real = max(f.degree for f in spectrum.factors) > 2 and is_reversible(matrix)
    solved = []
    for factor in spectrum.factors:
        block = factor.block.matrix if factor.degree == factor.block.size == 2 else None
        roots = _by_momentum(factor, spectrum) or radicals(factor.polynomial, matrix, spectrum.writer, block, real)
        solved.append(replace(factor, roots=tuple(roots)))
        if not roots:
            spectrum = spectrum.note(_no_radicals(factor, real))
    return replace(spectrum, factors=tuple(solved))


def _by_momentum(factor: Factor, spectrum: Spectrum) -> list[Any]:
    """Return the roots of a factor that is a whole block with known momenta; square roots read better than two."""
    momenta = factor.block.momenta
    if momenta is None or factor.degree != factor.block.size or factor.degree < 3:
        return []
    return momenta.roots(lambda c: spectrum.writer.write(spectrum.matrix.laurent(c)))


def _no_radicals(factor: Factor, real: bool) -> str:
    where = f"the block of size {factor.block.size} ({factor.block.label})"
    if not factor.irreducible:
        return f"the characteristic polynomial of {where} has powers too high to be factored; fix fewer parameters"
    if factor.degree == 3 and real:
        reason = "its three real roots would take a trigonometric form too long to read; fix a parameter"
    elif factor.degree == 3:
        reason = "degree 3 is written only where all eigenvalues are real, and this matrix is not reversible"
    else:
        reason = "a form by radicals that reads well exists for degrees 1, 2 and, if all eigenvalues are real, 3"
    return f"the characteristic polynomial of {where} has an irreducible factor of degree {factor.degree}; {reason}"


def leading_factor(spectrum: Spectrum) -> list[int]:
    """Return which factors may have the largest root, one that has it at some generic point first.

    One index when the matrix is irreducible: its Perron root is simple, so that it cannot
    pass from one factor to another as parameters change. Of classes that do not reach each
    other those stay whose root was not proved to be smaller than another one.
    """
    candidates = [i for i, f in enumerate(spectrum.factors) if f.leading and not f.is_zero]
    if not candidates:
        raise NotApplicable(
            "every configuration of this chain is forbidden: no two states can follow each other for ever; check which "
            "energies are math.inf and which weights are 0"
        )
    if len(candidates) < 2:
        return candidates
    radii = _radii(spectrum, candidates)
    homes = list(dict.fromkeys(block for i in candidates for block in spectrum.factors[i].homes))
    first = _largest(radii, candidates)
    if len(homes) < 2:
        return [first]
    left = undominated([block.matrix for block in homes], spectrum.matrix.alphabet)
    own = [[i for i in candidates if homes[k] in spectrum.factors[i].homes] for k in left]
    leading = dict.fromkeys(_largest(radii, each) for each in own)
    return sorted(leading, key=lambda i: i != first)


def leading_class(spectrum: Spectrum, leading: Factor) -> Spectrum:
    """Return the spectrum of the states that the infinite chain is in: those that lead, with their own eigenvalues.

    States that do not reach each other have eigenvalues of their own, which rings see and the
    infinite chain does not.
    """
    matrix = spectrum.matrix
    if isinstance(matrix, ColourMatrix) or len(leading.homes) != 1:
        return spectrum
    classes = components(Block(matrix.entries, "", positive=True))
    for own in classes if len(classes) > 1 else ():
        part = replace(spectrum, blocks=tuple(split(own.matrix)), factors=(), notes=())
        part = _with_factors(_with_polynomials(part))
        if any(f.polynomial == leading.polynomial and f.leading for f in part.factors):
            part = _with_roots(part)
            own_factors = (leading if f.polynomial == leading.polynomial else f for f in part.factors)
            return replace(part, factors=tuple(own_factors))
    return spectrum


def larger_factor(spectrum: Spectrum, first: int, second: int) -> int:
    """Return which of two factors has the largest root at a generic point."""
    return _largest(_radii(spectrum, [first, second], 1), [first, second])


def _radii(spectrum: Spectrum, candidates: Sequence[int], count: int = 3) -> list[dict[int, Any]]:
    """Return the largest moduli of roots at generic points."""
    alphabet = spectrum.matrix.alphabet
    points = [symbol_values(alphabet, point) for point in generic_points(alphabet, count)]
    return [{i: _radius(spectrum.factors[i].polynomial, values) for i in candidates} for values in points]


def _largest(radii: Sequence[dict[int, Any]], candidates: Sequence[int]) -> int:
    """Return the factor that has the largest root most often."""
    wins = [max(candidates, key=lambda i: at[i]) for at in radii]
    return max(candidates, key=wins.count)


def _radius(polynomial: Coefficients, values: list[Any]) -> Any:
    """Return the largest modulus of the roots, as a number of any size."""
    numbers = [number_value(c, values) for c in polynomial]
    scale = max((abs(c) ** (1 / type(c)(k)) for k, c in enumerate(numbers) if k and c), default=0)
    if not scale:
        return scale
    scaled = [float(c / scale**k) for k, c in enumerate(numbers)]
    return scale * float(max(abs(np.roots(scaled))))
