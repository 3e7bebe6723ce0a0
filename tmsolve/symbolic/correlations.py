"""Correlation functions ⟨a₀ b_r⟩ as formulas in a symbolic distance r.

The connected part is Σ A_i (λ_i/λ)ʳ, from some small distance on; distances before that are
given one by one. Every result is compared with the matrix at random rational points.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from ..errors import NotApplicable, SolveError
from ..tabulate.colours import numbers_of_colours
from .colours.matrix import inserted_colour_matrices
from .correlation_modes import Modes
from .correlation_values import PerronTrace
from .deadline import Clock, limited
from .field_text import FieldWriter
from .matrix import Insertions, SymbolicMatrix, inserted_matrices
from .perron import Perron, perron_of
from .spectrum import solve_spectrum
from .verify import evaluate, generic_points

__all__ = ["Correlation", "correlation", "single_correlation"]


@dataclass(frozen=True, eq=False)
class Correlation:
    """The correlation function of two observables as a sum of powers.

    Attributes
    ----------
    product : sympy expression
        ⟨a⟩⟨b⟩, what it tends to.
    terms : tuple of (amplitude, ratio)
        The connected part is Σ amplitude · ratioʳ for r ≥ ``start``.
    start : int
        Least distance for which the sum holds.
    early : tuple of sympy expressions
        Connected values at r = 0 … start − 1.
    """

    product: Any
    terms: tuple[tuple[Any, Any], ...]
    start: int
    early: tuple[Any, ...]

    def at(self, r: Any, connected: bool = True) -> Any:
        """Return the correlation at a whole distance or at a symbol."""
        import sympy as sp

        rest = 0 if connected else self.product
        if isinstance(r, int) and r < self.start:
            return self.early[r] + rest
        total = _sum(self.terms, r) + rest
        if isinstance(r, int) or not self.start:
            return total
        special = [(value + rest, sp.Eq(r, k)) for k, value in enumerate(self.early)]
        return sp.Piecewise(*special, (total, True))


def correlation(perron: Perron, first: str, second: str, clock: Clock) -> Correlation:
    """Derive ⟨a₀ b_r⟩ for two observables.

    Parameters
    ----------
    perron : Perron
        The largest eigenvalue of the chain, and the spectrum, solved by radicals.
    first, second : str
        Observables at cells 0 and r ≥ 0.
    clock : Clock
        The time left.

    Raises
    ------
    NotApplicable
        Eigenvalues without a form by radicals, several Perron roots, or Jordan blocks.
    """
    perron, put = _inserted(perron, first, second, clock)
    if not perron.spectrum.is_solved:
        raise NotApplicable(
            "the correlation function as a formula needs every eigenvalue by radicals; use "
            "solve(chain.at(…)).correlation(…) for numbers, or fix more parameters"
        )
    return limited(clock.left, _derive, perron, put, (first, second))


def single_correlation(perron: Perron, first: str, second: str, r: int, connected: bool, clock: Clock) -> Any:
    """Return ⟨a₀ b_r⟩ at one distance as a number of the field of the largest eigenvalue, which may be a symbol."""
    perron, put = _inserted(perron, first, second, clock)
    if not perron.spectrum.factors:
        raise NotApplicable("a correlation as a formula needs the characteristic polynomial, which is not known")
    return limited(clock.left, _single, perron, put, (first, second), r, connected)


def _single(perron: Perron, put: Insertions, names: tuple[str, str], r: int, connected: bool) -> Any:
    trace = PerronTrace(put, perron.spectrum.factors, perron.factor)
    leading = perron.factor
    block = leading.block.matrix if leading.degree == leading.block.size == 2 else None
    writer = FieldWriter(trace.field, trace.matrix, perron.spectrum.writer, perron.value, block)
    value = writer.write(trace.value(r))
    return value - perron.mean(names[0]) * perron.mean(names[1]) if connected else value


def _inserted(perron: Perron, first: str, second: str, clock: Clock) -> tuple[Perron, Insertions]:
    """Put the observables into the matrix, and solve it anew where they change it."""
    chain = perron.chain
    coloured = bool(numbers_of_colours(chain))
    put = limited(clock.left, inserted_colour_matrices if coloured else inserted_matrices, chain, first, second)
    if coloured or not _same_symbols(put.matrix, perron.spectrum.matrix):
        # Observables that are wide, or hold parameters of their own, change the matrix or its symbols.
        perron = perron_of(chain, solve_spectrum(put.matrix, clock))
    perron.require_simple_root()
    return perron, put


def _same_symbols(a: SymbolicMatrix, b: SymbolicMatrix) -> bool:
    return (a.size, a.alphabet.classes, a.alphabet.units) == (b.size, b.alphabet.classes, b.alphabet.units)


def _derive(perron: Perron, put: Insertions, names: tuple[str, str]) -> Correlation:
    trace = PerronTrace(put, perron.spectrum.factors, perron.factor)
    modes = Modes(perron, trace)
    terms = tuple(modes.terms())
    product = perron.mean(names[0]) * perron.mean(names[1])
    start = max(trace.zeros + trace.nearest, 0)
    early = [modes.writer.write(trace.value(r)) - product for r in range(start)]
    while start and _agree(trace, _sum(terms, start - 1), early[start - 1]):
        start -= 1
    found = Correlation(product, terms, start, tuple(early[:start]))
    for r in (start, start + 1, start + 2):
        if not _agree(trace, found.at(r, connected=False), modes.writer.write(trace.value(r))):
            raise SolveError(f"the correlation function derived is wrong at distance {r}; please report this chain")
    return found


def _sum(terms: Sequence[tuple[Any, Any]], r: Any) -> Any:
    import sympy as sp

    return sp.Add(*(amplitude * ratio**r for amplitude, ratio in terms))


def _agree(trace: PerronTrace, left: Any, right: Any) -> bool:
    import mpmath as mp

    with mp.workdps(50):
        for point in generic_points(trace.matrix.alphabet, 3, seed=11):
            a, b = (mp.mpmathify(evaluate(expr, point)) for expr in (left, right))
            if abs(a - b) > mp.mpf(10) ** -25 * (1 + abs(a)):
                return False
    return True
