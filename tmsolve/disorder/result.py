"""What is known of a disordered chain: averages per cell with error bars."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..errors import ParameterError
from .averaged_decay import averaged_decay
from .averaged_pairs import AveragedPairs, refuse_lists
from .averages import Average, average
from .chances import probability_derivative
from .controls import fit
from .exponents import Exponents
from .percell import PerCell, Sum
from .steps import BETA, StepMaker
from .walk import Rates

__all__ = ["QuenchedChain"]

#: Share of the noise that control variates are trusted to leave, at best.
_TRUSTED = 2e-4


@dataclass(frozen=True, eq=False)
class QuenchedChain(PerCell):
    """A chain averaged over quenched disorder; everything is per cell, with k_B = 1.

    Attributes
    ----------
    cells, replicas : int
        Cells that were averaged over in each of the independent replicas.
    burn_in : int
        Cells walked before, so that nothing remembers the end.
    seed : int
        Seed that gives the same numbers again.
    control_variates : bool
        Whether noise was taken out by control variates.
    notes : tuple of str
        What to know before the numbers are used.
    """

    cells: int
    replicas: int
    burn_in: int
    seed: int
    control_variates: bool
    notes: tuple[str, ...]
    _maker: StepMaker = field(repr=False)
    _rates: Rates = field(repr=False)
    _pilot: Rates | None = field(default=None, repr=False)
    _known: dict[Any, Any] = field(default_factory=dict, repr=False)

    def lyapunov(self, k: int) -> Average:
        """Return the k-th Lyapunov exponent of the product, k = 1 being the average of ln Z per cell."""
        found = self._exponents.exponent(k)
        return self._estimate((1.0, {}, {})) if k == 1 else found

    def correlation_length(self) -> Average:
        """Typical correlation length in cells: 1/(γ₁ − γ₂), from the average of the logarithm of correlations."""
        return self._exponents.correlation_length()

    def correlation(self, a: str, b: str, distance: int, power: int = 1) -> Average:
        """Average of (⟨a_i b_(i+r)⟩ − ⟨a_i⟩⟨b_(i+r)⟩)^power at r cells, from realisations of their own.

        The average (power 1) is dominated by few realisations; how a typical one decays is told by
        `correlation_length`.

        Raises
        ------
        ParameterError
            Observables that take a random parameter; unusable distances and powers.
        NotApplicable
            Random parameters that are lists.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, quenched
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)], observables={"m": lambda s: s})
        >>> signs = quenched(chain.fix(T=1), {"J": {-1: "1/2", 1: "1/2"}}, cells=20, replicas=2, rng=1)
        >>> round(signs.correlation("m", "m", 3, power=2).value, 12) == round(float(np.tanh(1)**6), 12)
        True
        """
        return self._pairs(a, b).at(distance, power)

    def glass_susceptibility(self, a: str) -> Average:
        """Spin-glass susceptibility Σ_r [(⟨a₀a_r⟩ − ⟨a₀⟩⟨a_r⟩)²] over all r, averaged over disorder; no factor of T."""
        return self._pairs(a, a).total(2)

    def average_correlation_length(self) -> Average:
        """Decay length in cells of the average of connected correlations, for any number of states.

        Rare places where correlations are strong make it longer than the typical one. Its error holds, beside the bar
        of the sample, what the last degree of polynomials of the message changed.

        Raises
        ------
        NotApplicable
            The sample is too small to see a decay, no state is allowed at every cut, or parameters that are lists.
        """
        refuse_lists(self._problem)
        if "decay" not in self._known:
            sizes = (self.cells, self.replicas, self.burn_in)
            self._known["decay"] = averaged_decay(self._problem, *sizes, self.seed)
        found: Average = self._known["decay"]
        return found

    def probability_derivative(self, name: str, value: Any, instead_of: Any = None) -> Average:
        """Average derivative of the free energy by the probability of one value of a random parameter.

        Parameters
        ----------
        name : str
            A random parameter.
        value : number
            The value that gains probability; one that the law does not have yet is allowed.
        instead_of : number, optional
            The value of a discrete law that loses it; without one, all values lose in proportion.

        Returns
        -------
        Average
            ∂f/∂p, p the probability moved; exact for any p, with the error bar of a sample of its own.

        Raises
        ------
        ParameterError
            Another name, or a value that has no probability to lose.
        NotApplicable
            The law is a list, or continuous while a single value is to lose.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising, quenched
        >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
        >>> diluted = quenched(chain.fix(T=1), {"J": {0: "0.2", 1: "0.8"}}, cells=10, replicas=2, rng=1)
        >>> round(diluted.probability_derivative("J", 1, instead_of=0).value, 12)       # −ln cosh 1
        -0.433780830483
        """
        sizes = (self.cells, self.replicas, self.burn_in)
        return probability_derivative(self._problem, sizes, self.seed, name, value, instead_of)

    def samples(self, quantity: str = "free_energy") -> np.ndarray:
        """Return ``free_energy`` or ``internal_energy`` of every replica by itself, without control variates."""
        if quantity == "free_energy":
            return self._rates.value * -self._problem.temperature
        if quantity == "internal_energy":
            return -self._rates.first[self._maker.tilts.index(BETA)]
        raise ParameterError(f"samples are kept of free_energy and internal_energy, got {quantity!r}")

    def _pairs(self, a: str, b: str) -> AveragedPairs:
        refuse_lists(self._problem)
        for name in (a, b):
            self._observable(name)
        if (a, b) not in self._known:
            sizes = (self.cells, self.replicas, self.burn_in)
            self._known[a, b] = AveragedPairs(self._problem, (a, b), sizes, self.seed)
        found: AveragedPairs = self._known[a, b]
        return found

    @property
    def _exponents(self) -> Exponents:
        if "exponents" not in self._known:
            measured = Exponents.measure(self._problem, self.cells, self.replicas, self.burn_in, self.seed)
            self._known["exponents"] = measured.steadied(self._controlled((1.0, {}, {})))
        found: Exponents = self._known["exponents"]
        return found

    def _estimate(self, wanted: Sum) -> Average:
        key = (wanted[0], *(tuple(sorted(part.items())) for part in wanted[1:]))
        if key not in self._known:
            self._known[key] = self._trusted(average(self._controlled(wanted)), wanted)
        found: Average = self._known[key]
        return found

    def _trusted(self, found: Average, wanted: Sum) -> Average:
        """Widen a bar that is next to nothing: what is left then comes from draws so rare that few samples hold one."""
        if self._pilot is None:
            return found
        noise = average(self._samples(self._rates, wanted, True)[0]).error
        return Average(found.value, max(found.error, _TRUSTED * noise), found.degrees)

    def _controlled(self, wanted: Sum) -> np.ndarray:
        """Return a sum of every replica, less what control variates explain with coefficients from other chains.

        In a nearly saturated chain the sum itself may vary less than its average over the next draw.
        """
        if self._pilot is None:
            return self._samples(self._rates, wanted, False)[0]
        fits = {ahead: fit(*self._samples(self._pilot, wanted, ahead)) for ahead in (True, False)}
        ahead = min(fits, key=lambda ahead: fits[ahead].left)
        samples, controls = self._samples(self._rates, wanted, ahead)
        return np.asarray(samples - fits[ahead].coefficients @ controls)

    def _samples(self, rates: Rates, wanted: Sum, ahead: bool) -> tuple[np.ndarray, np.ndarray]:
        """Return a wanted sum, shape (samples,), and what has mean 0 beside it, (controls, samples).

        ``ahead`` averages growth and first derivatives over the next draw.
        """
        growth, first, second = wanted
        averaged = ahead and rates.mean_value is not None and rates.mean_first is not None
        value, firsts = (rates.mean_value, rates.mean_first) if averaged else (rates.value, rates.first)
        assert value is not None and firsts is not None
        target = growth * value
        tilts = [self._tilt(tilt) for tilt in first]
        for i, c in zip(tilts, first.values(), strict=True):
            target = target + c * firsts[i]
        for pair, c in second.items():
            place = self._pair(pair)
            target = target + c * rates.second[place]
            tilts += self._maker.pairs[place]
        return target, self._controls(rates, list(dict.fromkeys(tilts)), bool(second))

    def _controls(self, rates: Rates, tilts: list[int], twice: bool) -> np.ndarray:
        if rates.controls is None or rates.slopes is None or rates.mean_value is None or rates.mean_first is None:
            return np.zeros((0, self.replicas))
        found = [rates.controls, *(rates.slopes[:, i] for i in tilts)]
        if twice:  # second derivatives are not averaged over the draw, so differences from such averages help
            surprise = rates.first - rates.mean_first
            found += [(rates.value - rates.mean_value)[None], *(surprise[i, None] for i in tilts)]
        return np.concatenate(found)

    def __str__(self) -> str:
        title = f"disorder average over {self.replicas} replicas of {self.cells} cells (seed {self.seed})"
        return "\n".join([title, self.summary(), *self.notes])
