"""Averages over the ground states of disordered chains: exact where that can be, else from sampled realisations."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from ..errors import ParameterError, did_you_mean, listing
from .averages import Average, average
from .cold_algebra import COUNTS
from .cold_chain import extreme_mean
from .cold_exact import exact_moves
from .cold_joint import JointLaw, joint_law
from .cold_quantities import Classes, Quantity, mean_quantity
from .cold_sample import GroundChains, GroundSample
from .cold_steps import ColdSteps
from .problem import Problem

__all__ = ["GroundAverages", "Number", "average_ratio", "written"]

#: Numbers of sampled ground states that are kept for the next question.
_KEPT = 2**23
#: A fraction with more letters is written as a decimal number.
_LONGEST_FRACTION = 24
#: Of an average, as a share of what the values span.
_ROUNDING = 1e-12

Number = Fraction | Average


@dataclass(frozen=True, eq=False)
class GroundAverages:
    """What averages over the ground states of a disordered chain are taken from.

    Attributes
    ----------
    problem : Problem
    cells, replicas, seed : int
        Of samples.
    most : int
        Values of a message that are followed exactly; 0 where the energy already takes more.
    counted : bool
        Whether messages with their numbers of ways take no more values than that.
    """

    problem: Problem
    cells: int
    replicas: int
    seed: int
    most: int
    counted: bool
    _laws: dict[Any, JointLaw | None] = field(default_factory=dict, repr=False)

    def mean(self, name: str) -> Number:
        """Mean of an observable per cell."""
        self.check(name)
        steps = ColdSteps(self.problem, (name,))
        quantity = mean_quantity(self.problem, steps.window, name)
        law = self.law(steps, {name: quantity})
        exact = self.unanimous(steps, quantity) if law is None else law.mean(name)
        if exact is not None:
            return exact
        parts = {str(i): Quantity((part,)) for i, part in enumerate(quantity.parts)}
        skipped = {one: self._before(steps, part) for one, part in parts.items()}
        samples = [
            np.sum([chains.mean(one, skipped[one]) for one in parts], axis=0) for chains in self.chains(steps, parts)
        ]
        return self.seen(samples, quantity.spread)

    def overlap(self, name: str) -> Number:
        """Average over the disorder of the squared mean of an observable of one site."""
        self.check(name)
        steps = ColdSteps(self.problem)
        Classes.read(self.problem, name)
        quantities = {name: mean_quantity(self.problem, steps.window, name)}
        law = self.law(steps, quantities)
        exact = None if law is None else law.overlap(name)
        if exact is not None:
            return exact
        most = max(float(np.abs(values).max()) for _, values, _ in quantities[name].parts)
        return self.seen([chains.overlap(name) for chains in self.chains(steps, quantities)], most**2)

    def check(self, name: str) -> None:
        """Refuse what is no observable, or takes random parameters."""
        kept = self.problem.observables
        if name not in kept:
            raise ParameterError(
                f"no observable {name!r} that is free of random parameters; there are {listing(kept)}."
                f"{did_you_mean(str(name), kept)}"
            )

    def _before(self, steps: ColdSteps, part: Quantity) -> int:
        """Return how many copies of a part begin before the end of one given realisation."""
        if not self.problem.listed:
            return 0
        narrow, wide = ColdSteps(self.problem).window.cut, steps.window.cut
        ((sites, *_),) = part.parts
        return max(0, *(wide.thresholds[kind] - narrow.widths[kind] - cell for kind, cell in sites))

    def law(self, steps: ColdSteps, quantities: Mapping[str, Quantity]) -> JointLaw | None:
        """Return the exact law of the ground states; ``None`` where a message takes too many values."""
        moves = exact_moves(steps, COUNTS, quantities) if self.counted else None
        if moves is None:
            return None
        cut = (steps.window.left, tuple(steps.window.cut.thresholds.items()))
        if cut not in self._laws:
            self._laws[cut] = joint_law(moves, self.most)
        found = self._laws[cut]
        return None if found is None else found.showing(moves)

    def unanimous(self, steps: ColdSteps, quantity: Quantity) -> Fraction | None:
        """Return the exact mean of a quantity where all ground states agree on it."""
        return extreme_mean(steps, quantity, self.most) if self.most else None

    def chains(self, steps: ColdSteps, quantities: Mapping[str, Quantity]) -> Iterable[GroundChains]:
        """Return sampled ground states; the same for the same cut."""
        found = GroundSample(steps, quantities, self.cells, self.replicas, self.seed)
        return list(found) if steps.states**2 * self.cells * self.replicas <= _KEPT else found

    def seen(self, samples: Iterable[np.ndarray], spread: float) -> Average:
        """Average over replicas.

        Where all replicas agree, the error is what one cell with another value would have made of it.
        """
        found = average(np.concatenate(list(samples)))
        rounding = _ROUNDING * spread
        value = found.value if abs(found.value) > rounding else 0.0
        if self.replicas == 1:
            return Average(value, 0.0)
        unseen = spread / (self.cells * self.replicas)
        return Average(value, found.error if found.error > rounding else unseen, found.degrees)


def written(number: Number) -> str:
    """Return a number as text; a fraction of many digits as a decimal number.

    Examples
    --------
    >>> written(Fraction(-5, 3)), written(Fraction(10**20, 3 * 10**20 + 1)), written(Average(0.5, 0.01))
    ('-5/3', '0.333333333333333', '0.500(10)')
    """
    exact = str(number)
    return exact if isinstance(number, Average) or len(exact) <= _LONGEST_FRACTION else f"{float(number):.15g}"


def average_ratio(above: np.ndarray, below: np.ndarray) -> Average:
    """Return the ratio of the means of two quantities of the same replicas; the error is that to first order.

    Examples
    --------
    >>> found = average_ratio(np.array([2.0, 4.1, 5.9]), np.array([1.0, 2.0, 3.0]))
    >>> found.value, found.error < 0.05
    (2.0, True)
    """
    value = float(above.sum() / below.sum())
    residue = average(above - value * below)
    return Average(value, residue.error / abs(float(below.mean())), residue.degrees)
