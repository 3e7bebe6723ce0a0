"""Points of a batch that share one chain of states and one number system."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..eigen.spectrum import Ratios
from ..operators.numbers import to_double

__all__ = ["Segment"]


@dataclass(frozen=True, eq=False)
class Segment:
    """The law at some points of a batch.

    Attributes
    ----------
    indices : ndarray of int
        Flat positions of these points in the batch.
    law : Law
        Cumulants and correlations of the dominant class of states.
    beta : ndarray
        Inverse temperature.
    least_energy : ndarray
        Least energy per cell e₀ of that class.
    log_root : ndarray
        ln λ₁ + β e₀.
    entropy : callable
        ln λ₁ + β⟨E⟩ as a sum of positive terms: entropy rate of the chain of states and of
        what lies between the cuts.
    bits : int
        Length of the numbers used.
    states : ndarray of int
        The class of states, out of all joint states of the cut.
    edge_table : callable
        Table per step of a quantity by its handle, on those states.
    spectrum : callable
        All eigenvalues of the dominant class but λ₁, as `Ratios`.
    other_classes : tuple of callables
        All eigenvalues of other classes of states, relative to λ₁.
    limit : bool
        Whether the points stand for T = 0; ``beta`` is then large but has no meaning.
    reason : str
        Why numbers of this length were used.
    arithmetic : str
        Whose numbers the Perron pair was found with.
    largest_cost : ndarray
        Largest difference of energies from the least, once potentials are taken out.
    input_error : callable
        Bound on what rounding of the parameters does to the vector, relative.
    """

    indices: np.ndarray
    law: Any
    beta: np.ndarray
    least_energy: np.ndarray
    log_root: np.ndarray
    entropy: Callable[[], np.ndarray]
    bits: int
    states: np.ndarray
    edge_table: Callable[[tuple[str, ...]], np.ndarray | None]
    spectrum: Callable[[], Ratios]
    other_classes: tuple[Callable[[], Ratios], ...] = ()
    limit: bool = False
    reason: str = "doubles suffice"
    arithmetic: str = "doubles"
    largest_cost: Any = 0.0
    input_error: Callable[[], Any] = float

    def double(self, values: Any) -> np.ndarray:
        """Round to doubles and spread over the points of the segment."""
        return np.broadcast_to(to_double(values), self.indices.shape)
