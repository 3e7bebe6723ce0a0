"""The second eigenvalue of the whole chain, whatever shows it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..eigen.merging import ROUNDING, conditions
from ..eigen.near_circle import NEAR
from ..eigen.spectrum import deflated
from .segment import Segment
from .slow import SMALL, Decay

__all__ = ["slowest"]

#: Eigenvalues this close to the largest, relative to it, may be about to merge with it.
_CLOSE = 1e-4
#: Batches and matrices up to this size are looked at for that.
_FEW, _NARROW = 400, 100


def slowest(segment: Segment) -> Decay:
    """Return the second-largest eigenvalue of the dominant class, with amplitude 1."""
    log_modulus, phase, log_gap = segment.spectrum()
    if log_gap.shape[1] == 0:
        return Decay.none(segment.indices.size)
    log_noise = np.full(segment.indices.size, -np.inf)
    small = np.flatnonzero(log_modulus[:, 0] < SMALL)
    if small.size:
        law = segment.law
        log_noise[small] = deflated(law.pair.chance[..., small], law.stationary[:, small], law.numbers).log_noise
    found = Decay.none(len(log_noise))
    return replace(
        found,
        log_modulus=log_modulus[:, 0].copy(),
        log_gap=log_gap[:, 0].copy(),
        wave_number=np.abs(phase[:, 0]),
        amplitude=np.ones(len(log_noise)),
        log_noise=log_noise,
        log_rough=_roughness(segment, log_modulus, phase),
    )


def _roughness(segment: Segment, log_modulus: np.ndarray, phase: np.ndarray) -> np.ndarray:
    """Return what rounding does to eigenvalues that have another one close by, of which they may be a part."""
    result, law = np.full(len(log_modulus), -np.inf), segment.law
    if len(log_modulus) > _FEW or not 2 < len(segment.states) <= _NARROW:
        return result
    with np.errstate(invalid="ignore"):
        others = np.exp(log_modulus - log_modulus[:, :1] + 1j * (phase - phase[:, :1]))
        close = (np.abs(others[:, 1:] - 1) < _CLOSE).any(axis=1) & (log_modulus[:, 0] < -NEAR)
    for i in np.flatnonzero(close):
        rest = deflated(law.pair.chance[..., [i]], law.stationary[:, [i]], law.numbers)
        size = float(rest.log_size[0])
        value = np.exp(log_modulus[i, :1] - size + 1j * phase[i, :1])
        unit = max(float(rest.log_noise[0]), size + np.log(4 * len(segment.states) * ROUNDING))
        result[i] = unit + np.log(conditions(rest.matrix[..., 0], value)[0])
    return result
