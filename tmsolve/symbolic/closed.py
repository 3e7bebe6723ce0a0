"""The closed form of a chain: eigenvalues, partition functions and thermodynamics as formulas."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, TypeVar

from ..declare.chain import Chain
from ..errors import NotApplicable, ParameterError, TooLargeError, did_you_mean, listing
from . import report
from .arguments import whole_cells, whole_distance
from .blocks import Block
from .correlations import Correlation, correlation, single_correlation
from .deadline import Clock, TimeUp, limited
from .lengths import correlation_length
from .open_formula import long_open_sum, open_formula
from .perron import Perron, ordered_eigenvalues, perron_of
from .promises import finished, not_finished
from .recurrence import ring_sum, trace_of_power
from .spectrum import Spectrum

__all__ = ["ClosedForm"]

Result = TypeVar("Result")


@dataclass(frozen=True, eq=False, repr=False)
class ClosedForm:
    """Formulas of an infinite chain and of rings, in β = 1/T and the names of the parameters.

    Made by `closed_form`. Every expression is a sympy expression in the real symbols of the
    chain's free parameters and the positive symbol ``beta``; energies are in the user's
    unit, k_B = 1, quantities per unit cell.

    Attributes
    ----------
    chain : Chain
        What was solved.
    is_closed : bool
        Whether every eigenvalue is written down.
    why : str
        How far it went, and what stopped it.
    time_limit : float
        Seconds that each later question may take.

    Examples
    --------
    >>> from tmsolve import Chain, bond, closed_form, colours
    >>> form = closed_form(Chain(colours(3), [bond(lambda s, t, J: -J*(s == t))]))
    >>> form.partition_function()
    2*(exp(J*beta) - 1)**N + (exp(J*beta) + 2)**N
    """

    chain: Chain
    is_closed: bool
    why: str
    time_limit: float
    spectrum: Spectrum = field(repr=False)
    _correlations: dict[tuple[str, str], Correlation] = field(default_factory=dict, init=False, repr=False)

    # --- the matrix and its spectrum

    @cached_property
    def matrix(self) -> Any:
        """Transfer matrix over the smallest cut, as a sympy Matrix of sums of exponentials."""
        return self._within("the matrix", lambda: report.matrix(self.spectrum))

    @property
    def blocks(self) -> tuple[Block, ...]:
        """Blocks of the matrix: ``.size``, ``.multiplicity``, ``.label``; sizes times multiplicities add up to it."""
        return self.spectrum.blocks

    @cached_property
    def eigenvalues(self) -> list[tuple[Any, int]]:
        """Eigenvalues with multiplicities, the Perron root first; empty where not all can be written."""
        if not self.is_closed:
            return []
        return ordered_eigenvalues(self.spectrum, self._perron)

    @cached_property
    def characteristic_polynomial(self) -> Any:
        """Characteristic polynomial in the symbol ``lambda``, factored as far as it was."""
        self._require_polynomial("the characteristic polynomial")
        return self._within("the characteristic polynomial", lambda: report.polynomial(self.spectrum))

    @cached_property
    def recurrence(self) -> tuple[Any, ...]:
        """Coefficients c₁, c₂, … of Z_N = c₁ Z_{N−1} + c₂ Z_{N−2} + … for N > their number."""
        self._require_polynomial("the recurrence")
        return self._within("the recurrence", lambda: report.recurrence(self.spectrum))

    def partition_function(self, N: int | None = None) -> Any:
        """Partition function of a ring of N cells.

        Parameters
        ----------
        N : int, optional
            Number of cells, larger than the longest shift; then the exact sum of exponentials is
            returned, with or without a closed form. A symbol when left out.

        Raises
        ------
        NotApplicable
            No closed form for symbolic N, or a ring shorter than its bonds.
        """
        import sympy as sp

        if N is not None:
            return self._ring(whole_cells(N, self.chain))
        if not self.is_closed:
            raise NotApplicable(
                f"no closed form of Z_N for symbolic N: {self.why}. Use partition_function(12) for a given number of "
                "cells, .recurrence, or .characteristic_polynomial"
            )
        cells = report.cells_symbol()
        return sp.Add(*(m * value**cells for value, m in self.eigenvalues if value != 0))

    def _ring(self, cells: int) -> Any:
        trace = ring_sum if self.spectrum.factors else trace_of_power
        try:
            return limited(self.time_limit, lambda: report.long_sum(self.spectrum, trace(self.spectrum, cells)))
        except TimeUp:
            raise TooLargeError(
                f"Z_{cells} of this chain was not expanded within {self.time_limit:g} s; ask for fewer cells, fix "
                "parameters with chain.fix(…), or give a longer time_limit"
            ) from None

    def open_partition_function(self, N: int | None = None) -> Any:
        """Partition function of an open chain of N cells; terms that reach beyond an end are left out.

        For a number of cells the exact sum of exponentials, with or without a closed form; N is a
        symbol when left out.

        Examples
        --------
        >>> from tmsolve import Chain, bond, closed_form, ising
        >>> form = closed_form(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
        >>> form.open_partition_function()
        2*(2*cosh(J*beta))**(N - 1)
        """
        if N is not None:
            cells = whole_cells(N, self.chain, ring=False)
            return self._within(f"Z_{cells} of an open chain", lambda: long_open_sum(self.chain, self.spectrum, cells))
        if not self.is_closed:
            raise NotApplicable(f"no closed form of Z_N for symbolic N: {self.why}. Give a number of cells")
        formula = self._within("Z_N of an open chain", lambda: open_formula(self.chain, self.spectrum))
        return formula.at(report.cells_symbol())

    # --- thermodynamics

    @cached_property
    def _perron(self) -> Perron:
        self._require_polynomial("a formula for the largest eigenvalue")
        return self._within("the largest eigenvalue", lambda: perron_of(self.chain, self.spectrum))

    @property
    def free_energy(self) -> Any:
        """Free energy per cell, f = −(1/β) ln λ₁.

        Where λ₁ has no form by radicals it is the symbol ``lambda``: the largest root of
        `characteristic_polynomial`.
        """
        return self._perron.free_energy

    @cached_property
    def internal_energy(self) -> Any:
        """Internal energy per cell, u = ∂(βf)/∂β at fixed parameters."""
        return self._thermal("the internal energy", lambda: self._perron.internal_energy)

    @cached_property
    def entropy(self) -> Any:
        """Entropy per cell, s = β(u − f)."""
        return self._thermal("the entropy", lambda: self._perron.entropy)

    @cached_property
    def specific_heat(self) -> Any:
        """Specific heat per cell at fixed parameters, c = ∂u/∂T."""
        return self._thermal("the specific heat", lambda: self._perron.specific_heat)

    def derivative(self, *names: str) -> Any:
        """Derivative of the free energy by parameters and ``"T"``, in any order and number.

        Raises
        ------
        ParameterError
            A name that is not a free parameter.
        """
        for name in names:
            self._check_free(name)
        if not names:
            return self.free_energy
        return self._within("the derivative", lambda: self._perron.derivative(names))

    def mean(self, name: str) -> Any:
        """Mean of an observable per cell.

        The source −φ a is added to the energy and the Perron root differentiated at φ = 0, so
        that the observable needs no field among the parameters.
        """
        self.chain.observable(name)
        return self._within(f"the mean of {name!r}", lambda: self._perron.mean(name))

    def susceptibility(self, first: str, second: str | None = None) -> Any:
        """Susceptibility ∂⟨a⟩/∂φ for an added energy −φ b; b is a when left out."""
        other = self._second(first, second)
        return self._within(f"the susceptibility of {first!r}", lambda: self._perron.susceptibility(first, other))

    @cached_property
    def correlation_length(self) -> Any:
        """Correlation length in cells, −1/ln(|λ₂|/λ₁).

        Where different eigenvalues have the second largest modulus at different parameters, it is the
        maximum of their moduli. States that those of the infinite chain do not reach are left out.
        """
        if not self.is_closed:
            raise NotApplicable(f"the correlation length needs all eigenvalues: {self.why}")
        self._perron.require_one_root()
        return self._within("the correlation length", lambda: correlation_length(self.spectrum, self._perron))

    def correlation(self, first: str, second: str | None = None, r: int | None = None, connected: bool = True) -> Any:
        """Correlation ⟨a₀ b_r⟩ of two observables, b at r ≥ 0 cells after a; b is a when left out.

        Where two eigenvalues coincide, terms diverge against each other and their sum stands for its limit.

        Parameters
        ----------
        first, second : str
            The observables a and b.
        r : int, optional
            The distance in cells; the symbol ``r`` when left out.
        connected : bool
            Whether ⟨a⟩⟨b⟩ is subtracted.

        Raises
        ------
        NotApplicable
            Several classes of states; a symbol r where not every eigenvalue is written by radicals.

        Examples
        --------
        >>> from tmsolve import Chain, bond, closed_form, ising
        >>> form = closed_form(Chain(ising(), [bond(lambda s, t, J: -J*s*t)], {"m": lambda s: s}))
        >>> form.correlation("m")
        tanh(J*beta)**r
        """
        other = self._second(first, second)
        distance = whole_distance(r, self.chain)
        if r is None and not self.is_closed:
            raise NotApplicable(f"the correlation function needs all eigenvalues: {self.why}. Give a distance: r=3")
        try:
            return self._correlation(first, other, distance, connected)
        except TimeUp:
            raise not_finished(f"the correlation of {first!r} and {other!r}", self.time_limit) from None

    def _correlation(self, first: str, second: str, r: Any, connected: bool) -> Any:
        clock, pair = Clock(self.time_limit), (first, second)
        if not self.is_closed:
            return single_correlation(self._perron, *pair, r, connected, clock)
        if pair not in self._correlations:
            self._correlations[pair] = correlation(self._perron, *pair, clock)
        return self._correlations[pair].at(r, connected)

    # --- what keeps the promises

    def _within(self, what: str, compute: Callable[[], Result]) -> Result:
        return finished(what, self.time_limit, compute)

    def _thermal(self, what: str, compute: Callable[[], Result]) -> Result:
        if "T" in self.chain.fixed:
            raise NotApplicable(f"{what} differentiates by T, which is fixed in this chain; leave T free")
        return self._within(what, compute)

    def _second(self, first: str, second: str | None) -> str:
        other = first if second is None else second
        for name in (first, other):
            self.chain.observable(name)
        return other

    def _check_free(self, name: str) -> None:
        known = [*self.chain.free, *([] if "T" in self.chain.fixed else ["T"])]
        if name not in known:
            fixed = " It is fixed." if name in self.chain.fixed else did_you_mean(name, known)
            raise ParameterError(f"no free parameter {name!r}; this form depends on {listing(known)}.{fixed}")

    def _require_polynomial(self, what: str) -> None:
        if not self.spectrum.factors:
            raise NotApplicable(f"{what} is not known: {self.why}; partition_function(N) with a number still works")

    def __str__(self) -> str:
        return report.text(self)

    def __repr__(self) -> str:
        kind = "closed form" if self.is_closed else "no closed form"
        return f"<ClosedForm of {self.chain.name!r}: {kind}, {self.spectrum.matrix.size} x {self.spectrum.matrix.size}>"

    def _repr_latex_(self) -> str:
        return report.latex(self)
