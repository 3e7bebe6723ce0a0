"""Z_N of an open chain as a sum of powers of eigenvalues, for symbolic N."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from ..declare.chain import Chain
from ..errors import NotApplicable, SolveError
from .colours.matrix import ColourMatrix
from .field import Element, RootField
from .field_text import FieldWriter
from .open_ends import OpenProduct, open_sum
from .polynomials import divided, product_of
from .report import long_sum
from .spectrum import Factor, Spectrum
from .verify import evaluate, generic_points

__all__ = ["OpenFormula", "long_open_sum", "open_formula"]


@dataclass(frozen=True, eq=False)
class OpenFormula:
    """Z_N = Σ amplitude · eigenvalueᴺ⁻ᵇ for N ≥ ``start``, b being ``base``.

    Attributes
    ----------
    terms : tuple of (amplitude, eigenvalue)
        The modes that the ends see.
    base : int
        By how much the exponents are smaller than N.
    start : int
        Least number of cells for which the sum holds.
    early : tuple of sympy expressions
        Z_1 … Z_(start − 1).
    """

    terms: tuple[tuple[Any, Any], ...]
    base: int
    start: int
    early: tuple[Any, ...]

    def at(self, N: Any) -> Any:
        """Return Z_N at a symbol."""
        import sympy as sp

        total = sp.Add(*(amplitude * value ** (N - self.base) for amplitude, value in self.terms))
        special = [(value, sp.Eq(N, k)) for k, value in enumerate(self.early, start=1)]
        return sp.Piecewise(*special, (total, True)) if special else total


def open_formula(chain: Chain, spectrum: Spectrum) -> OpenFormula:
    """Derive Z_N of an open chain from a solved spectrum.

    Raises
    ------
    NotApplicable
        The matrix cannot be made diagonal.
    """
    if isinstance(spectrum.matrix, ColourMatrix):
        # Free ends treat all colours alike.
        spectrum = spectrum.symmetric_part()
    ends = OpenProduct(chain, spectrum.matrix)
    modes = _Modes(spectrum, ends)
    terms = tuple(term for factor in modes.seen for term in modes.terms(factor))
    start = max(1, modes.zeros + ends.missing)
    short = [long_open_sum(chain, spectrum, n) for n in range(1, start + 3)]
    while start > 1 and _agree(spectrum, terms, start - 1 - ends.missing, short[start - 2]):
        start -= 1
    for n in range(start, start + 3):
        if n <= len(short) and not _agree(spectrum, terms, n - ends.missing, short[n - 1]):
            raise SolveError(f"the formula found for open chains is wrong for {n} cells; please report this chain")
    return OpenFormula(terms, ends.missing, start, tuple(short[: start - 1]))


def long_open_sum(chain: Chain, spectrum: Spectrum, cells: int) -> Any:
    """Return Z_N of an open chain as expanded exponentials."""
    return long_sum(spectrum, open_sum(chain, spectrum.matrix, cells))


def _agree(spectrum: Spectrum, terms: Sequence[tuple[Any, Any]], power: int, expected: Any) -> bool:
    import mpmath as mp

    with mp.workdps(50):
        for point in generic_points(spectrum.matrix.alphabet, 3, seed=5):
            parts = [evaluate(a, point) * evaluate(value, point) ** power for a, value in terms]
            right = evaluate(expected, point)
            if abs(mp.fsum(parts) - right) > mp.mpf(10) ** -25 * (mp.fsum(map(abs, parts)) + abs(right)):
                return False
    return True


class _Modes:
    """Amplitudes in u Mᵏ v = Σ A_i λ_iᵏ."""

    def __init__(self, spectrum: Spectrum, ends: OpenProduct) -> None:
        self.spectrum = spectrum
        self.ends = ends
        self.ring = ends.matrix.alphabet.ring
        factors = [f for f in spectrum.factors if not f.is_zero]
        minimal = product_of([f.polynomial for f in factors], self.ring)
        self.zeros = self._zeros(minimal, sum(f.multiplicity for f in spectrum.factors if f.is_zero))
        self.seen, self.numerator = self._reduced(factors, self._whole_numerator(minimal))

    def _zeros(self, minimal: Sequence[Any], most: int) -> int:
        """Return the least k from which the sequence obeys the recurrence."""
        degree = len(minimal) - 1
        for z in range(most + 1):
            # Twice the degree of terms decide about a recurrence of that degree.
            if all(self._recurs(minimal, z + k) for k in range(degree + most - z)):
                return z
        raise NotApplicable(
            "the transfer matrix of this chain cannot be made diagonal (equal eigenvalues share an eigenvector), so "
            "that Z_N of open chains is not a sum of powers; give a number of cells"
        )

    def _recurs(self, minimal: Sequence[Any], k: int) -> bool:
        degree = len(minimal) - 1
        total = self.ring.zero
        for j, c in enumerate(minimal):
            total = total + c * self.ends.element(k + degree - j)
        return not total

    def _whole_numerator(self, minimal: Sequence[Any]) -> list[Any]:
        """Return P, lowest power first."""
        m = list(reversed(minimal))
        values = [self.ends.element(self.zeros + k) for k in range(len(m) - 1)]
        sums = []
        for j in range(len(m) - 1):
            total = self.ring.zero
            for k, value in enumerate(values[: len(m) - 1 - j]):
                total = total + m[j + 1 + k] * value
            sums.append(total)
        return sums

    def _reduced(self, factors: Sequence[Factor], numerator: list[Any]) -> tuple[list[Factor], list[Any]]:
        """Cancel the factors that divide P: modes that the ends do not see."""
        seen = []
        for factor in factors:
            quotient, rest = divided(numerator, factor.polynomial)
            if any(rest):
                seen.append(factor)
            else:
                numerator = quotient
        return seen, numerator

    def terms(self, factor: Factor) -> list[tuple[Any, Any]]:
        """Return (amplitude, eigenvalue) for every root of a factor."""
        matrix, writer = self.spectrum.matrix, self.spectrum.writer
        field = RootField(factor.polynomial, self.ring)
        block = factor.block.matrix if factor.degree == factor.block.size == 2 else None
        element = self._amplitude(field, factor)
        found = []
        for k, value in enumerate(factor.roots):
            text = FieldWriter(field, matrix, writer, value, block)
            turned = element if k == 0 or factor.degree != 2 else field.conjugate(element)
            found.append((text.write(field.signed(turned)), value))
        return found

    def _amplitude(self, field: RootField, factor: Factor) -> Element:
        """Return P(μ)/m'(μ) times the scale of the ends and the powers of μ that windows without the root 0 lack."""
        up = field.embed(self.numerator)
        keys = [field.mu] * self.zeros
        if factor.degree > 1:
            keys.append(field.slope)
        for other in self.seen:
            if other is not factor:
                keys.append(field.denominator(field.embed(tuple(reversed(other.polynomial))), other.degree))
        above, below = self.ring.one, self.ring.one
        for symbol, exponent in zip(self.ring.gens, self.ends.ends, strict=True):
            above, below = above * symbol ** max(exponent, 0), below * symbol ** max(-exponent, 0)
        keys.append(field.denominator(field.embed((below,)), 0))
        return field.over(tuple(above * c for c in up), *keys)
