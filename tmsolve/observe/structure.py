"""Structure factors in the positive form: mean squares of martingale differences.

With z = e^{ik} and h the solution of (1 − zP) h = P X − ⟨X⟩, the differences
M_ij = X_ij − ⟨X⟩ + z h_j − h_i have zero mean given i, and the Fourier sum of the connected
correlation of X is

    S(k) = Σ_ij π_i P_ij ( |M_ij|² + C_ij ),

with C the variance inside a window: a sum of positive terms at every k, however slowly
correlations decay. Writing 1 − zP = (1 − P) + (1 − z) P with the deviation matrix D of
1 − P gives h = (1 + (1 − z) D P)⁻¹ D b, and 1 − z = 2 sin²(k/2) − i sin k without loss.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import partial
from typing import Any

import numpy as np

from ..assemble.matrix import handle
from ..assemble.window import ChainWindow
from .correlations import anchors
from .evaluate import Laws
from .segment import Segment

__all__ = ["structure_factor", "structure_factors"]


def structure_factors(laws: Laws, a: str, wave_numbers: Sequence[float]) -> np.ndarray:
    """Return S(k) of a whole batch, shape (size, wave numbers), with longer numbers where doubles are too short."""
    values = np.full((laws.size, len(wave_numbers)), np.nan)
    level: Laws | None = laws
    while level is not None and np.isnan(values).any():
        window, _ = level.resolved((a,))
        found = level.collect(
            partial(structure_factor, window, a=a, wave_numbers=wave_numbers), (a,), (len(wave_numbers),)
        )
        values = np.where(np.isnan(values), found, values)
        level = level.sharper
    return values


def structure_factor(window: ChainWindow, segment: Segment, a: str, wave_numbers: Sequence[float]) -> np.ndarray:
    """Return S(k) = Σ_r e^{ikr} (⟨a₀a_r⟩ − ⟨a⟩²), shape (points, wave numbers).

    NaN where the numbers are too short for a mode that oscillates with just this k and hardly
    decays.
    """
    cells = anchors(window, a)
    names = [handle("observable", (), f"{a}@{cell}") for cell in cells]
    known = [(cell, segment.edge_table((name,))) for cell, name in zip(cells, names, strict=True)]
    tables = [(cell, table) for cell, table in known if table is not None]
    result = np.zeros((segment.indices.size, len(wave_numbers)))
    if not tables:
        return result
    law = segment.law
    deviation = law.pair.reduction.deviation()
    onward = (deviation[:, :, None] * law.pair.chance[None]).sum(axis=1)
    for column, k in enumerate(wave_numbers):
        real: Any = sum(_times(law.numbers, np.cos(k * cell), table) for cell, table in tables)
        imaginary: Any = sum(_times(law.numbers, np.sin(k * cell), table) for cell, table in tables)
        lost = _resonant(segment, k)
        total = _variance(segment, names, cells, k)
        total = total + _mean_square(law, onward, (real, imaginary), k, lost)
        result[:, column] = np.where(lost, np.nan, segment.double(total))
    return result


def _resonant(segment: Segment, k: float) -> np.ndarray:
    """Whether 1 − e^{ik} λ/λ₁ is lost to rounding for some eigenvalue; slow modes at small k are not."""
    log_modulus, phase, _ = segment.spectrum()
    if log_modulus.shape[1] == 0 or np.cos(k) > 0.5:
        return np.zeros(segment.indices.shape, dtype=bool)
    distance = np.abs(np.expm1(log_modulus + 1j * _folded(phase + k))).min(axis=1)
    # It enters S(k) by its square.
    return np.asarray(distance < 2.0 ** (14 - segment.bits / 2), dtype=bool)


def _folded(angle: np.ndarray) -> np.ndarray:
    """Return angles in (−π, π], with rounding around 0 removed."""
    folded = np.remainder(angle + np.pi, 2 * np.pi) - np.pi
    return np.where(np.abs(folded) < 1e-15, 0.0, folded)


def _times(numbers: Any, factor: float, table: np.ndarray) -> np.ndarray:
    return table * numbers.scalar(float(factor))


def _variance(segment: Segment, names: Sequence[str], cells: Sequence[int], k: float) -> Any:
    """Return the part of S(k) from sites that are summed out together."""
    law = segment.law
    total = law.stationary[0] * 0
    for first, c in zip(names, cells, strict=True):
        for second, d in zip(names, cells, strict=True):
            inside = segment.edge_table(tuple(sorted((first, second))))
            if inside is not None:
                total = total + law.average(inside) * law.numbers.scalar(float(np.cos(k * (c - d))))
    return total


def _mean_square(law: Any, onward: np.ndarray, table: tuple[Any, Any], k: float, lost: np.ndarray) -> Any:
    """Return Σ π P |M|²; complex numbers are kept as pairs so that long numbers serve as well."""
    numbers = law.numbers
    # A double next to π stands for π.
    cosine, sine = numbers.scalar(float(np.cos(k))), numbers.scalar(float(np.sin(k)) if abs(np.sin(k)) > 4e-16 else 0.0)
    less = numbers.scalar(float(2 * np.sin(k / 2) ** 2))
    shape = law.pair.chance.shape
    real, imaginary = (np.broadcast_to(part, shape) for part in table)
    x, y = (law.pair.reduction.poisson(law.conditional(table)) for table in (real, imaginary))
    n = shape[0]
    # Solutions have zero mean; weighing the mean like the rest keeps it from drowning.
    weight = 1 + (less + abs(sine)) * np.abs(onward).max(axis=(0, 1))
    eye = numbers.array(np.eye(n))[..., None] + weight * law.stationary[None]
    # (1 + (less − i sin) D P)(u + iv) = x + iy as one real system of twice the size.
    same, cross = eye + less * onward, sine * onward
    system = np.concatenate([np.concatenate([same, cross], axis=1), np.concatenate([-cross, same], axis=1)], axis=0)
    # Points that are lost to these numbers may be singular; they are done again with longer ones.
    system = np.where(lost, numbers.array(np.eye(2 * n))[..., None], system)
    solved = _solve(system, np.concatenate([x, y], axis=0))
    u, v = solved[:n], solved[n:]
    turned_u, turned_v = cosine * u - sine * v, sine * u + cosine * v
    first, second = law.differences(real, turned_u), law.differences(imaginary, turned_v)
    return law.average(first * first + second * second)


def _solve(system: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Solve batched linear systems, batch last; long numbers by elimination with row pivots."""
    if system.dtype != object:
        stacked = np.moveaxis(system, -1, 0)
        return np.moveaxis(np.linalg.solve(stacked, np.moveaxis(right, -1, 0)[..., None])[..., 0], 0, -1)
    solved = np.empty_like(right)
    for point in range(right.shape[-1]):
        a, b = system[..., point].copy(), right[:, point].copy()
        for k in range(len(a)):
            pivot = k + int(np.argmax(np.abs(a[k:, k])))
            a[[k, pivot]], b[[k, pivot]] = a[[pivot, k]], b[[pivot, k]]
            share = a[k + 1 :, k] / a[k, k]
            a[k + 1 :] = a[k + 1 :] - share[:, None] * a[k]
            b[k + 1 :] = b[k + 1 :] - share * b[k]
        for k in range(len(a) - 1, -1, -1):
            b[k] = (b[k] - (a[k, k + 1 :] * b[k + 1 :]).sum()) / a[k, k]
        solved[:, point] = b
    return solved
