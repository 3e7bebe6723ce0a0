"""The algebra of derivatives: any derivative of f as a sum of cumulants, exactly.

A quantity is kept as Σ c β^a K(blocks), where K is a joint cumulant per cell of local
quantities (energy derivatives, weight derivatives, observables) and c is rational. With
the log weight B = −βE + ω, differentiating by a parameter θ gives

    ∂_θ K(b₁…b_m) = Σ_i K(…∂_θ b_i…) + K(b₁…b_m, −βE_θ + ω_θ),

and by T the same with ∂_T B = β²E − βE_T + ω_T, plus the derivative of β^a. Terms that
cancel (the mean energy in the specific heat, say) cancel here, in rational arithmetic, and
not between floating-point numbers.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction

from ..assemble.matrix import handle
from ..declare import Chain

__all__ = ["DISORDER", "LEAST_ENERGY", "ROOT", "Field", "Series"]

#: ln λ₁ as a block; what remains of it after −β e₀ is taken out.
ROOT = "root||"
#: ln λ₁ + β⟨E⟩ as a block.
DISORDER = "disorder||"
#: The least energy per cell e₀ as a block.
LEAST_ENERGY = "least||"

_ENERGY = handle("energy")


@dataclass(frozen=True)
class Field:
    """The field conjugate to an observable: a term −φ·a in the energy, at φ = 0."""

    observable: str


Monomial = tuple[int, tuple[str, ...]]


class Series:
    """Σ c β^a K(blocks) with rational c.

    Parameters
    ----------
    chain : Chain
        Says which terms depend on which parameters.
    terms : mapping
        (power of β, sorted blocks) to coefficient.
    """

    def __init__(self, chain: Chain, terms: Mapping[Monomial, Fraction]) -> None:
        self.chain = chain
        self.terms = {monomial: c for monomial, c in terms.items() if c}

    @classmethod
    def free_energy(cls, chain: Chain) -> Series:
        """Return f = −β⁻¹ ln λ₁ per cell."""
        return cls(chain, {(-1, (ROOT,)): Fraction(-1)})

    @classmethod
    def of_observables(cls, chain: Chain, names: Iterable[str], power: int) -> Series:
        """Return β^power times the joint cumulant of some observables."""
        blocks = tuple(sorted(handle("observable", (), name) for name in names))
        return cls(chain, {(power, blocks): Fraction(1)})

    def __add__(self, other: Series) -> Series:
        terms = dict(self.terms)
        for monomial, c in other.terms.items():
            terms[monomial] = terms.get(monomial, Fraction(0)) + c
        return Series(self.chain, terms)

    def times(self, factor: int, power: int = 0) -> Series:
        """Return factor · β^power times the series."""
        return Series(self.chain, {(a + power, blocks): c * factor for (a, blocks), c in self.terms.items()})

    def derive(self, by: str | Field) -> Series:
        """Differentiate by a parameter, by ``"T"``, or by the field conjugate to an observable."""
        collected: dict[Monomial, Fraction] = {}

        def put(power: int, blocks: Iterable[str], c: Fraction) -> None:
            monomial = (power, tuple(sorted(blocks)))
            collected[monomial] = collected.get(monomial, Fraction(0)) + c

        for (a, blocks), c in self.terms.items():
            if by == "T" and a:
                put(a + 1, blocks, -a * c)
            rest = () if blocks == (ROOT,) else blocks
            for power, block, sign in self._log_weight(by):
                put(a + power, (*rest, block), sign * c)
            if isinstance(by, str):
                for i, block in enumerate(rest):
                    derived = self._derived(block, by)
                    if derived is not None:
                        put(a, (*rest[:i], derived, *rest[i + 1 :]), c)
        return Series(self.chain, collected)

    def _log_weight(self, by: str | Field) -> list[tuple[int, str, int]]:
        """Return ∂B as (power of β, block, sign)."""
        if isinstance(by, Field):
            return [(1, handle("observable", (), by.observable), 1)]
        parts = []
        if by == "T":
            parts.append((2, _ENERGY, 1))
        if self._depends("energy", by):
            parts.append((1, handle("energy", (by,)), -1))
        if self._depends("weight", by):
            parts.append((0, handle("weight", (by,)), 1))
        return parts

    def _depends(self, role: str, name: str) -> bool:
        return any(term.role == role and name in term.parameters for term in self.chain.terms)

    def _derived(self, block: str, by: str) -> str | None:
        kind, observable, key = block.split("|")
        if kind == "observable":
            if not any(by in term.parameters for term in self.chain.observable(observable)):
                return None
        elif not self._depends(kind, by):
            return None
        return handle(kind, (*filter(None, key.split(",")), by), observable)

    def gauged(self) -> dict[Monomial, Fraction]:
        """Return the terms with e₀ split off from ln λ₁ and from the mean energy.

        ln λ₁ = root − β e₀ and ⟨E⟩ = e₀ + ⟨E − e₀⟩. Where ln λ₁ + β⟨E⟩ occurs, as in the
        entropy, it becomes one block, which is a sum of positive terms.
        """
        terms = dict(self.terms)
        for (a, blocks), c in self.terms.items():
            if blocks == (ROOT,) and terms.get((a + 1, (_ENERGY,))) == c:
                del terms[a, blocks], terms[a + 1, (_ENERGY,)]
                terms[a, (DISORDER,)] = c
        for (a, blocks), c in list(terms.items()):
            if blocks in ((ROOT,), (_ENERGY,)):
                power, share = (a + 1, -c) if blocks == (ROOT,) else (a, c)
                monomial: Monomial = (power, (LEAST_ENERGY,))
                terms[monomial] = terms.get(monomial, Fraction(0)) + share
        return {monomial: c for monomial, c in terms.items() if c}
