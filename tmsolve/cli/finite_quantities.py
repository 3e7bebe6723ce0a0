"""The quantities of ``tmsolve finite``: their names on the command line, and how each is computed."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from ..errors import NotApplicable, ParameterError, did_you_mean, listing
from .outcome import UsageError

if TYPE_CHECKING:
    from ..declare import Chain
    from ..finite.distribution import Distribution
    from ..finite.results import FiniteChain
    from .finite_realised import GivenChain

__all__ = ["FORMS", "LISTED", "TABLES", "Asked", "DomainTable", "read_quantity"]

#: Name -> how it is written.
FORMS = {
    "log_Z": "log_Z",
    "free_energy": "free_energy",
    "total": "total(a)",
    "mean": "mean(a) or mean(a,i)",
    "covariance": "covariance(a) or covariance(a,b)",
    "correlation": "correlation(a,b,i,j)",
    "cumulants": "cumulants(a)",
    "moments": "moments(a)",
    "profile": "profile(a)",
    "distribution": "distribution(a)",
    "domains": "domains(a)",
}
#: How many observables, and how many cells, may stand in the brackets.
_SHAPES = {
    "log_Z": {(0, 0)},
    "free_energy": {(0, 0)},
    "total": {(1, 0)},
    "mean": {(1, 0), (1, 1)},
    "covariance": {(1, 0), (2, 0)},
    "correlation": {(2, 2)},
    "cumulants": {(1, 0)},
    "moments": {(1, 0)},
    "profile": {(1, 0)},
    "distribution": {(1, 0)},
    "domains": {(1, 0)},
}
#: Quantities that can be drawn: one number per cell or per value.
LISTED = ("profile", "distribution")
#: Quantities that are one table.
TABLES = (*LISTED, "domains")


@dataclass(frozen=True)
class DomainTable:
    """Domains by value of an observable; the mean length of a value that never occurs is None."""

    values: list[Any]
    fractions: list[float]
    numbers: list[float]
    mean_lengths: list[float | None]


@dataclass(frozen=True)
class Asked:
    """A quantity as asked for.

    Attributes
    ----------
    kind : str
        A key of `FORMS`.
    observables : tuple of str
    cells : tuple of int
    """

    kind: str
    observables: tuple[str, ...]
    cells: tuple[int, ...]

    @property
    def name(self) -> str:
        """Its name, written in one way."""
        inside = ",".join([*self.observables, *map(str, self.cells)])
        return f"{self.kind}({inside})" if inside else self.kind

    @property
    def unit(self) -> str:
        """Its unit."""
        return "energy" if self.kind == "free_energy" else "1"

    def evaluate(self, chain: FiniteChain | GivenChain) -> float | list[float] | Distribution | DomainTable:
        """Compute it: a number, one number per order or cell, a distribution, or a table of domains."""
        if self.kind in _OF_EQUAL_CELLS:
            return _OF_EQUAL_CELLS[self.kind](chain, self.observables[0])
        found = _COMPUTE[self.kind](chain, *self.observables, *self.cells)
        return [float(value) for value in found] if getattr(found, "shape", ()) else float(found)

    def error(self, chain: FiniteChain | GivenChain) -> list[float]:
        """Return bounds on the errors of all numbers it consists of; none where there is no bound."""
        bound = getattr(chain, "error_bound", None)
        if bound is None or self.kind in _OF_EQUAL_CELLS:
            return []
        if self.kind == "mean" and self.cells:
            return [float(bound("profile", *self.observables, self.cells)[0])]
        found = bound(self.kind, *self.observables, *self.cells)
        return [float(value) for value in found.ravel()]


_COMPUTE: dict[str, Callable[..., Any]] = {
    "log_Z": lambda chain: chain.log_Z,
    "free_energy": lambda chain: chain.free_energy,
    "total": lambda chain, a: chain.total(a),
    "mean": lambda chain, a, *cells: chain.profile(a, cells)[0] if cells else chain.mean(a),
    "covariance": lambda chain, *pair: chain.covariance(*pair),
    "correlation": lambda chain, a, b, i, j: chain.correlation(a, b, i, j),
    "cumulants": lambda chain, a: chain.cumulants(a),
    "moments": lambda chain, a: chain.moments(a),
    "profile": lambda chain, a: chain.profile(a),
}


def _domains(chain: FiniteChain, observable: str) -> DomainTable:
    found = chain.domains(observable)
    lengths: list[float | None] = []
    for value in found.values:
        try:
            lengths.append(float(found.mean_length(value)))
        except NotApplicable:
            lengths.append(None)
    return DomainTable(
        [int(value) if value.denominator == 1 else float(value) for value in found.values],
        [float(found.fraction(value)) for value in found.values],
        [float(found.number(value)) for value in found.values],
        lengths,
    )


_OF_EQUAL_CELLS: dict[str, Callable[..., Any]] = {
    "distribution": lambda chain, a: chain.distribution(a),
    "domains": _domains,
}


def read_quantity(text: str, chain: Chain, cells: int) -> Asked:
    """Read a name such as ``correlation(m,m,0,5)``.

    Raises
    ------
    UsageError
        Unknown quantity or observable, a wrong number of them, or a cell out of range.
    """
    found = re.fullmatch(r"\s*(\w+)\s*(?:\((.*)\))?\s*", text)
    kind = found.group(1) if found else text
    if found is None or kind not in FORMS:
        hint = did_you_mean(kind, FORMS)
        if kind in chain.observables:
            hint = f" {kind!r} is an observable: mean({kind})"
        raise UsageError(f"--read {text}: no quantity {kind!r}; finite chains have {listing(FORMS.values())}.{hint}")
    inside = [part.strip() for part in (found.group(2) or "").split(",") if part.strip()]
    observables = tuple(part for part in inside if not _is_number(part))
    numbers = tuple(int(part) for part in inside if _is_number(part))
    if (len(observables), len(numbers)) not in _SHAPES[kind] or inside != [*observables, *map(str, numbers)]:
        raise UsageError(f"--read {text}: write {FORMS[kind]}, a and b observables, i and j cells")
    for observable in observables:
        try:
            chain.observable(observable)
        except ParameterError as error:
            raise UsageError(f"--read {text}: {error}") from error
    for number in numbers:
        if not 0 <= number < cells:
            raise UsageError(f"--read {text}: cells are numbered 0 to {cells - 1}, got {number}")
    return Asked(kind, observables, numbers)


def _is_number(text: str) -> bool:
    return re.fullmatch(r"-?\d+", text) is not None
