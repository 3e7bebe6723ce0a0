"""The eigenvalues of a transfer matrix as levels: multiplicities, complex pairs, Jordan blocks."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..declare import Point
from ..eigen.classify import Cluster, classified, grouped
from ..eigen.spectrum import Ratios
from ..errors import NotApplicable
from ..operators.numbers import to_double
from .arguments import check_count
from .evaluate import Laws
from .lost import whole_spectrum

__all__ = ["Level", "levels"]


@dataclass(frozen=True)
class Level:
    """One eigenvalue of the transfer matrix per cell.

    Attributes
    ----------
    log_modulus : float
        ln |λ|.
    phase : float
        Argument in (−π, π].
    multiplicity : int
        How many eigenvalues coincide here.
    label : str
        Running number, λ₁ first.
    log_gap : float
        ln(ln λ₁/|λ|), also where the gap is below all doubles; −inf for λ₁.
    kind : str
        ``"simple"``; ``"complex pair"`` for one of two conjugate eigenvalues;
        ``"semisimple"`` for several that coincide, each with a vector of its own; ``"Jordan"``
        where there are fewer vectors than eigenvalues, so that correlations carry powers of r.
    condition : float
        How many times rounding of the matrix moves the eigenvalue; NaN where it was not looked
        at (next to λ₁, and several classes of states).
    discriminant : float
        Mean of (λ − mean)² of the eigenvalues that coincide here, relative to λ₁², as computed:
        of a pair that merges the square of half its distance, below rounding.
    """

    log_modulus: float
    phase: float
    multiplicity: int
    label: str
    log_gap: float
    kind: str = "simple"
    condition: float = 1.0
    discriminant: float = 0.0

    @property
    def value(self) -> complex:
        """The eigenvalue itself (may overflow to inf at low temperature)."""
        modulus = float(np.exp(self.log_modulus)) if self.log_modulus < 709 else float("inf")
        if self.phase in (0.0, np.pi):
            return complex(modulus if self.phase == 0 else -modulus)
        return complex(modulus * np.cos(self.phase), modulus * np.sin(self.phase))

    @property
    def defective(self) -> bool:
        """Whether there are fewer vectors than eigenvalues."""
        return self.kind == "Jordan"

    @property
    def merging_pair(self) -> bool:
        """Whether two eigenvalues meet here on their way from real to complex."""
        return self.defective and self.multiplicity == 2 and np.isfinite(self.log_modulus)


def levels(laws: Laws, point: Point, count: int | None) -> tuple[Level, ...]:
    """Return the eigenvalues of a single point as levels, λ₁ first.

    Parameters
    ----------
    laws : Laws
        Of one point.
    point : Point
    count : int, optional
        How many levels; all of them when left out.
    """
    if point.shape != ():
        raise NotApplicable(
            f"levels are told apart point by point, and this is a batch of shape {point.shape}; "
            "solve(point.pick(i)).spectrum(), or gaps(k) for the whole batch"
        )
    if count is not None:
        check_count("k", count)
    if float(point.number("T")) == 0:
        raise NotApplicable("at T = 0 eigenvalues have no finite logarithm; gaps(k) has the limits of their ratios")
    segment = laws.segments()[0]
    log_root = float(to_double(segment.log_root - segment.beta * segment.least_energy)[0])
    here = Ratios(*(part[0] for part in whole_spectrum(laws, point, segment)))
    found: list[Cluster]
    if segment.other_classes or np.isnan(here.log_gap).any():
        found = grouped(here)
    else:
        law = segment.law
        found = classified(law.pair.chance[..., 0], law.stationary[:, 0], here, law.numbers)
    # λ₁ itself stands with those that coincide with it.
    first = [level for level in found if level.log_gap == -np.inf and level.phase == 0]
    rest = [level for level in found if level not in first]
    times = 1 + sum(level.multiplicity for level in first)
    top = Level(log_root, 0.0, times, "λ1", -np.inf, "simple" if times == 1 else "semisimple")
    others = [_level(level, log_root, number) for number, level in enumerate(rest, start=2)]
    every = (top, *others)
    return every if count is None else every[:count]


def _level(level: Cluster, log_root: float, number: int) -> Level:
    turned = level.kind == "simple" and level.phase not in (0.0, np.pi)
    return Level(
        log_root + level.log_modulus,
        level.phase,
        level.multiplicity,
        f"λ{number}",
        level.log_gap,
        "complex pair" if turned else level.kind,
        level.condition,
        level.discriminant,
    )
