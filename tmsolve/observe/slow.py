"""The slowest mode per point of a batch, and how well it is known."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

__all__ = ["SMALL", "Decay", "Found"]

#: Smaller eigenvalues (ln |λ/λ₁|) may lose digits to rounding.
SMALL = -8.0


@dataclass(frozen=True)
class Decay:
    """The slowest mode per point.

    Attributes
    ----------
    log_modulus, log_gap : ndarray
        ln |λ/λ₁| = −1/ξ and ln(−ln |λ/λ₁|) = −ln ξ; −inf and inf where there is no mode.
    wave_number : ndarray
        |arg λ|; 0 where there is no mode.
    amplitude : ndarray
        A in A r^p cos(kr + φ) e^{−r/ξ}; 0 where there is no mode.
    log_noise : ndarray
        Logarithm of the absolute rounding of λ/λ₁.
    power : ndarray
        p, more than 0 where blocks of Jordan contribute.
    doubt : ndarray
        Relative rounding of the amplitude, infinite where modes that coincide may not be one.
    levels : ndarray
        Where several eigenvalues that coincide in doubles make the mode: how many of all differ. Else 0.
    log_rough : ndarray
        Logarithm of what rounding does to an eigenvalue that is about to merge with another.
    """

    log_modulus: np.ndarray
    log_gap: np.ndarray
    wave_number: np.ndarray
    amplitude: np.ndarray
    log_noise: np.ndarray
    power: np.ndarray
    doubt: np.ndarray
    levels: np.ndarray
    log_rough: np.ndarray

    @classmethod
    def none(cls, size: int) -> Decay:
        """Return what holds where nothing decays."""
        values = {name: np.zeros(size) for name in cls.__dataclass_fields__}
        values |= {name: np.full(size, -np.inf) for name in ("log_modulus", "log_noise", "log_rough")}
        return cls(**{**values, "log_gap": np.full(size, np.inf)})

    @classmethod
    def unknown(cls, size: int) -> Decay:
        """Return what stands where the mode is not known."""
        values = vars(cls.none(size))
        lost = {name: np.full(size, np.nan) for name in ("log_modulus", "log_gap", "wave_number", "amplitude")}
        return cls(**{**values, **lost, "log_noise": np.full(size, np.inf), "doubt": np.full(size, np.inf)})

    @property
    def undecided(self) -> np.ndarray:
        """Where the mode is not known."""
        return np.isnan(self.log_gap) & np.isposinf(self.log_noise)

    def poor(self, accuracy: float = 1e-11) -> np.ndarray:
        """Whether rounding may have changed a length by more than ``accuracy``, relative to it."""
        with np.errstate(invalid="ignore"):
            return np.asarray(self.log_noise - self.log_modulus - self.log_gap > np.log(accuracy))

    def rough(self, accuracy: float = 1e-11) -> np.ndarray:
        """Whether an eigenvalue that is about to merge with another may be off by more than that, relative to ξ."""
        with np.errstate(invalid="ignore"):
            return np.asarray(self.log_rough - self.log_modulus - self.log_gap > np.log(accuracy))

    def at(self, points: np.ndarray) -> Decay:
        """Return what holds at some points."""
        return Decay(*(values[points] for values in vars(self).values()))

    def put(self, points: np.ndarray, part: Decay) -> None:
        """Store what was found at some points."""
        for mine, other in zip(vars(self).values(), vars(part).values(), strict=True):
            mine[points] = other


class Found(NamedTuple):
    """What doubles say on the slowest mode that an observable shows, per point.

    Attributes
    ----------
    chosen : Decay
        The slowest mode whose amplitude is above rounding.
    leading : Decay
        The slowest mode of all; of unknown amplitude.
    seen : ndarray of int
        How many eigenvalues are surely shown, multiple ones counted once.
    unsure : ndarray of bool
        Whether there is a slower mode than the chosen one, or none was chosen.
    """

    chosen: Decay
    leading: Decay
    seen: np.ndarray
    unsure: np.ndarray

    @classmethod
    def none(cls, size: int) -> Found:
        """Return what holds where nothing decays."""
        return cls(Decay.none(size), Decay.none(size), np.zeros(size, dtype=np.intp), np.zeros(size, dtype=bool))

    def put(self, points: np.ndarray, part: Found) -> None:
        """Store what was found at some points."""
        self.chosen.put(points, part.chosen)
        self.leading.put(points, part.leading)
        self.seen[points], self.unsure[points] = part.seen, part.unsure
