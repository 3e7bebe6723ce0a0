"""``tmsolve finite --realisation``: the quantities of one chain whose parameters are listed cell by cell."""

from __future__ import annotations

import argparse
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..errors import ParameterError, listing
from .finite_quantities import FORMS, Asked
from .model import Values
from .outcome import UsageError
from .together import refuse_beside

if TYPE_CHECKING:
    import numpy as np

    from ..disorder.realised import Realised
    from ..models import LoadedModel

__all__ = ["GivenChain", "check_readings", "given_chain"]

#: Quantities that are computed where every cell has its own parameters.
_KINDS = ("log_Z", "free_energy", "total", "mean", "covariance", "correlation", "profile")
_IDLE = {
    "left": "the ends of a given chain are free",
    "right": "the ends of a given chain are free",
    "impurity": "every cell has its own parameters in the file already",
}


@dataclass(frozen=True)
class GivenChain:
    """One realisation, read like any finite chain."""

    solved: Realised

    @property
    def cells(self) -> int:
        """Number of cells."""
        return self.solved.cells

    @property
    def closed(self) -> bool:
        """Whether the chain is a ring."""
        return self.solved.closed

    @property
    def log_Z(self) -> float:
        """Logarithm of the partition function."""
        return self.solved.log_Z

    @property
    def free_energy(self) -> float:
        """−T ln Z, in energy units."""
        return self.solved.free_energy

    def mean(self, a: str) -> float:
        """Mean of an observable per cell."""
        return self.solved.mean(a)

    def total(self, a: str) -> float:
        """Mean of an observable summed over the chain."""
        return float(self.profile(a).sum())

    def covariance(self, *pair: str) -> float:
        """Covariance of totals."""
        return self.solved.covariance(*pair)

    def correlation(self, a: str, b: str, i: int, j: int) -> float:
        """Connected correlation of two cells."""
        return self.solved.correlation(a, b, i, j)

    def profile(self, a: str, cells: Iterable[int] | None = None) -> np.ndarray:
        """Mean of an observable in every cell, or in some."""
        found = self.solved.profile(a)
        return found if cells is None else found[list(cells)]


def check_readings(asked: Iterable[Asked]) -> None:
    """Refuse quantities that a realisation does not have.

    Raises
    ------
    UsageError
        One of them is asked for.
    """
    for one in asked:
        if one.kind not in _KINDS:
            raise UsageError(
                f"--read {one.name}: of a realisation there are {listing(FORMS[kind] for kind in _KINDS)}; for "
                f"{FORMS[one.kind]} of a chain with some cells unlike the others give --impurity instead"
            )


def given_chain(
    arguments: argparse.Namespace, model: LoadedModel, values: Values, columns: Mapping[str, list[float]]
) -> GivenChain:
    """Solve the chain of --realisation.

    Raises
    ------
    UsageError
        Options that do not go with a given chain, or too few cells.
    """
    from ..disorder.realised import realisation

    refuse_beside(arguments, "--realisation", _IDLE)
    boundary = "open" if arguments.open else "ring"
    try:
        return GivenChain(realisation(model.chain.fix(**values.numbers), columns, boundary))
    except ParameterError as error:
        raise UsageError(f"--realisation: {error}") from error
