"""The verb `ground_state`: what a chain does at T = 0, exactly."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from types import MappingProxyType
from typing import Any

import numpy as np

from ..assemble.window import build_window
from ..declare import Chain, Point
from ..errors import DeclarationError, NotApplicable
from .components import Component, critical_components, strong_parts
from .configurations import Configuration
from .excursions import Excursions, Gap
from .graph import CutGraph
from .limits import dominant_components, limit_mean
from .printing import report
from .rings import ring_ground_states
from .tables import exact_values, refuse_thermal

__all__ = ["GroundState", "ground_state"]

#: Ground states whose energies differ by less, relative to the largest local energy, nearly tie.
_NEAR = Fraction(1, 10**12)


@dataclass(frozen=True, eq=False)
class GroundState:
    """Ground states of a chain at fixed parameters; energies in the user's unit, quantities per cell.

    Attributes
    ----------
    chain : Chain
    parameters : mapping of str to Fraction
        The values it was looked at.
    energy : Fraction
        Least energy per cell.
    exact : bool
        False where energies came as rounded numbers, of transcendental functions say; ties
        are then judged on their shortest decimals.
    components : tuple of Component
        Sets of ground states that can follow each other at no cost, largest entropy first;
        each with ``period``, ``entropy``, ``degeneracy`` and ``examples``.
    notes : tuple of str
        Near ties and other reservations.
    """

    chain: Chain
    parameters: Mapping[str, Fraction]
    energy: Fraction
    exact: bool
    components: tuple[Component, ...]
    notes: tuple[str, ...]
    _graph: CutGraph

    @cached_property
    def _dominant(self) -> list[Component]:
        return dominant_components(self.components)

    @cached_property
    def _excursions(self) -> Excursions:
        return Excursions(self._graph, self._dominant)

    @property
    def configurations(self) -> tuple[Configuration, ...]:
        """Configurations over one period each: all of them without entropy, else a few of every component."""
        return tuple(item for part in self.components for item in part.examples)

    @property
    def entropy(self) -> float:
        """Residual entropy per cell: lim T→0 of s, the logarithm of the growth factor."""
        return self._dominant[0].entropy

    @property
    def entropy_text(self) -> str:
        """The residual entropy as a formula where its degree allows, such as ``ln((1+sqrt(5))/2)``."""
        return self._dominant[0].growth.text

    @property
    def entropy_polynomial(self) -> Any:
        """Minimal polynomial of exp(entropy) over the integers, a ``sympy.Poly`` in x.

        The growth factor is its largest real root. ``None`` where the critical graph is too
        large to have it formed.
        """
        return self._dominant[0].growth.polynomial

    @cached_property
    def degeneracy(self) -> float:
        """Number of ground states of the infinite chain; inf where they have an entropy."""
        return sum(part.degeneracy for part in self.components)

    @cached_property
    def means(self) -> Mapping[str, Fraction | float | None]:
        """Limit T → 0 of every observable, per cell; exact where possible, None where unresolved."""
        return MappingProxyType({name: self._limit(name) for name in self.chain.observables})

    def mean(self, observable: str) -> Fraction | float:
        """Return lim T→0 of an observable per cell.

        Raises
        ------
        ParameterError
            There is no such observable.
        NotApplicable
            Ground states that tie in energy, entropy and excitations give different values.
        """
        self.chain.observable(observable)
        value = self._limit(observable)
        if value is None:
            raise NotApplicable(
                f"the limit of mean({observable}) is unresolved: ground states tie in energy, entropy and cheapest "
                "excitations, differ in this mean, and no symmetry that was tried relates them; "
                "solve at small T > 0, or break the tie with a small field"
            )
        return value

    def _limit(self, name: str) -> Fraction | float | None:
        tied = len(self._dominant) > 1
        return limit_mean(self._graph, self._dominant, self._excursions if tied else None, name)

    @property
    def gap(self) -> Gap:
        """The low-temperature form ln(λ/ρ) ≃ A exp(−Δ/T), as ``.energy`` Δ, ``.amplitude`` A and ``.walks``."""
        return self._excursions.gap

    def ring(self, cells: int) -> tuple[Fraction, int | Fraction]:
        """Return the least energy of a ring of so many cells, and how many configurations have it.

        Configurations are weighted with the degeneracies of their states. The ring's energy
        exceeds ``cells`` times the energy per cell where no ground state fits its length.

        Raises
        ------
        ParameterError
            Fewer cells than the longest term spans.
        TooLargeError
            More than 256 cut states.
        """
        return ring_ground_states(self._graph, cells)

    def __str__(self) -> str:
        return report(self)

    def __repr__(self) -> str:
        return f"<GroundState of {self.chain.name!r}: energy {self.energy}, entropy {self.entropy:.6g}>"


def ground_state(chain: Chain | Point) -> GroundState:
    """Find all ground states of a chain with fixed parameters, in exact rational arithmetic.

    The ground states of an infinite chain are the cheapest cycles of the graph whose nodes
    are the states of the smallest cut and whose steps are one cell long. Decimals and
    fractions are exact, a float is its shortest decimal.

    Parameters
    ----------
    chain : Chain or Point
        Every parameter fixed or with a default; of a point, T is not looked at.

    Returns
    -------
    GroundState
        Energy, configurations, residual entropy, limits of observables, gap.

    Raises
    ------
    ParameterError
        A parameter has no value.
    NotApplicable
        An energy takes T, a term is a weight, or no configuration is allowed.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ground_state, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], {"m": lambda s: s})
    >>> at_saturation = ground_state(chain.fix(J=-1, h=2))
    >>> at_saturation.energy, at_saturation.entropy_text, round(at_saturation.means["m"], 12)
    (Fraction(-1, 1), 'ln((1+sqrt(5))/2)', 0.4472135955)
    """
    if not isinstance(chain, (Chain, Point)):
        raise DeclarationError(f"ground_state takes a chain with fixed parameters, got {chain!r}")
    declared = chain.chain if isinstance(chain, Point) else chain
    refuse_thermal(declared)
    values = exact_values(chain)
    return analyse(declared, values)


def analyse(chain: Chain, values: Mapping[str, Fraction]) -> GroundState:
    """Return the ground states at exact values of all parameters."""
    graph = CutGraph(build_window(chain), values)
    components = sorted(critical_components(graph), key=lambda part: -part.entropy)
    notes = tuple([*_inexact(graph), *_near_ties(graph, components)])
    return GroundState(
        chain, MappingProxyType(dict(values)), graph.energy, graph.exact, tuple(components), notes, graph
    )


def _inexact(graph: CutGraph) -> Iterable[str]:
    if not graph.exact:
        yield "inexact: some energies are rounded numbers; ties are judged on their shortest decimals"


def _near_ties(graph: CutGraph, components: Iterable[Component]) -> Iterable[str]:
    """Describe cycles that are dearer than the ground states by less than 1e-12 of the energy scale."""
    found = graph.cheapest
    unit = graph.unit * found.unit
    limit = math.floor(graph.scale * _NEAR * unit)
    critical = {int(e) for part in components for e in part.edges}
    near = found.inner[np.asarray(found.reduced <= limit * min(graph.size, 64), dtype=bool)]
    if limit == 0 or set(near.tolist()) <= critical:
        return
    reduced = dict(zip(found.inner.tolist(), found.reduced.tolist(), strict=True))
    for part in strong_parts(graph, near):
        extra = [e for e in part.edges.tolist() if e not in critical]
        for edge in extra[:8]:
            cycle = part.cycle_through(edge)
            excess = Fraction(sum(reduced[e] for e in cycle), len(cycle) * unit)
            if 0 < excess < graph.scale * _NEAR:
                item = part.written(cycle)
                yield (
                    f"near tie: {item} lies only {float(excess):.3g} above the ground state, less than 1e-12 of the "
                    f"energy scale {float(graph.scale):g}; if both were meant to be equal, give decimals or fractions"
                )
                break
