"""The largest eigenvalue as a formula, and its derivatives."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from typing import Any

from ..declare.chain import Chain
from ..errors import NotApplicable
from ..tabulate.symbolic import beta, parameter_symbols
from .field import RootField
from .field_text import FieldWriter
from .sources import mean_element, response_element
from .spectrum import Factor, Spectrum, leading_factor
from .thermal import LogSum, Thermal

__all__ = ["Perron", "eigenvalue_symbol", "ordered_eigenvalues", "perron_of"]


def eigenvalue_symbol() -> Any:
    """Return the symbol ``lambda`` of characteristic polynomials; alone, it is the largest root."""
    import sympy as sp

    return sp.Symbol("lambda")


def perron_of(chain: Chain, spectrum: Spectrum) -> Perron:
    """Find the factor that holds the largest eigenvalue."""
    import sympy as sp

    leading = [spectrum.factors[i] for i in leading_factor(spectrum)]
    factor = leading[0]
    values = [f.roots[0] if f.roots else None for f in leading]
    if len(leading) == 1:
        value = values[0] if values[0] is not None else eigenvalue_symbol()
    elif all(value is not None for value in values):
        value = sp.Max(*values, evaluate=False)
    else:
        value = eigenvalue_symbol()
    return Perron(chain, spectrum, factor, value, tied=len(leading) > 1 or factor.leading > 1)


class Perron:
    """The Perron root of a chain.

    Parameters
    ----------
    chain, spectrum : Chain, Spectrum
        Where it belongs.
    factor : Factor
        Its factor of the characteristic polynomial.
    value : sympy expression
        The root by radicals, or the symbol ``lambda`` that stands for it.
    tied : bool
        Whether different factors lead at different parameters (a reducible matrix).
    """

    def __init__(self, chain: Chain, spectrum: Spectrum, factor: Factor, value: Any, tied: bool) -> None:
        self.chain = chain
        self.spectrum = spectrum
        self.factor = factor
        self.value = value
        self.tied = tied
        self._means: dict[str, Any] = {}

    @property
    def beta(self) -> Any:
        """β, or the number that a fixed temperature makes of it."""
        return 1 / parameter_symbols(self.chain)["T"]

    @property
    def free_energy(self) -> Any:
        """Return −(1/β) ln λ."""
        import sympy as sp

        return -sp.log(self.value) / self.beta

    def require_one_root(self) -> None:
        """Refuse what has a meaning for one largest eigenvalue only."""
        self._require(not self.tied)

    def require_simple_root(self) -> None:
        """Refuse what has a meaning for a simple largest eigenvalue only, which symmetric states may share too."""
        self._require(not self.tied and self.factor.multiplicity == 1)

    def _require(self, fulfilled: bool) -> None:
        if not fulfilled:
            raise NotApplicable(
                "the states of this chain fall into classes that do not reach each other, and several have the "
                "largest eigenvalue, here or at other parameters; there is no one formula for derivatives. Use "
                "solve(chain.at(…))"
            )

    @cached_property
    def _thermal(self) -> tuple[Thermal, FieldWriter]:
        self.require_one_root()
        matrix, factor = self.spectrum.matrix, self.factor
        field = RootField(factor.polynomial, matrix.alphabet.ring)
        block = factor.block.matrix if factor.degree == factor.block.size == 2 else None
        writer = FieldWriter(field, matrix, self.spectrum.writer, self.value, block)
        return Thermal(matrix.alphabet, matrix.scale, field), writer

    def differentiated(self, names: Sequence[str], start: Any) -> Any:
        """Return the derivative of start · ln λ by parameters and T, in this order.

        ``names`` may also hold "beta", which is by β itself.
        """
        thermal, writer = self._thermal
        total = LogSum(start, {})
        for name in names:
            by_beta = name in ("beta", "T")
            total = thermal.differentiate(total, beta() if by_beta else parameter_symbols(self.chain)[name])
            if name == "T":
                total = thermal.scaled(total, -(beta() ** 2))
        return thermal.write(total, writer)

    @cached_property
    def internal_energy(self) -> Any:
        """Return −∂ ln λ/∂β."""
        return self.differentiated(["beta"], -1)

    @cached_property
    def entropy(self) -> Any:
        """Return ln λ + β u."""
        import sympy as sp

        return sp.log(self.value) + beta() * self.internal_energy

    @cached_property
    def specific_heat(self) -> Any:
        """Return β² ∂² ln λ/∂β²."""
        return self.differentiated(["beta", "T"], -1)

    def derivative(self, names: Sequence[str]) -> Any:
        """Return the derivative of f by parameters and T."""
        return self.differentiated(sorted(names, key=lambda name: name == "T"), -1 / self.beta)

    def mean(self, name: str) -> Any:
        """Return the mean of an observable per cell."""
        if name not in self._means:
            self.require_one_root()
            writer, element = mean_element(self.chain, name, self.value, self.spectrum)
            self._means[name] = writer.write(element)
        return self._means[name]

    def susceptibility(self, first: str, second: str) -> Any:
        """Return ∂⟨first⟩/∂φ for an added energy −φ·second."""
        self.require_one_root()
        writer, element = response_element(self.chain, first, second, self.value, self.spectrum)
        return self.beta * writer.write(element)


def ordered_eigenvalues(spectrum: Spectrum, perron: Perron) -> list[tuple[Any, int]]:
    """Return all eigenvalues with multiplicities, those of the factor with the Perron root first."""
    import sympy as sp

    first = perron.factor
    ordered: list[Factor] = [first, *(f for f in spectrum.factors if f is not first)]
    found: dict[Any, int] = {}
    for factor in ordered:
        values = [sp.Integer(0)] if factor.is_zero else list(factor.roots)
        for value in values:
            found[value] = found.get(value, 0) + factor.multiplicity
    return [(value, m) for value, m in found.items()]
