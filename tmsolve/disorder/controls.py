"""Control variates for averages over disorder: what is known to be zero on the average takes noise away.

For any function φ of the message, φ(xₜ) − E[φ(xₜ₊₁)|xₜ] is the martingale difference
φ(xₜ₊₁) − E[φ(xₜ₊₁)|xₜ] up to a telescoping sum, and zero on the average of a stationary chain.
So is its derivative along any parameter. If φ solves Poisson's equation, nothing is left of the noise
(S. G. Henderson and P. W. Glynn, Math. Oper. Res. 27, 253 (2002); from memory); polynomials of the
message come close.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations_with_replacement

import numpy as np

from .message import Growth, Message, advance
from .steps import Steps

__all__ = ["Expected", "Fit", "Lens", "expected", "features", "fit"]

#: Degrees and number of polynomials of the message.
_DEGREE = {1: 7, 2: 4, 3: 3}
_MOST_FEATURES = 16
#: Shares of the largest variation below which combinations of controls may be left out: all of them at the first.
_CUTS = np.array([1.0, *(10.0**-k for k in range(1, 13))])


@dataclass(frozen=True, eq=False)
class Lens:
    """How messages are looked at, so that polynomials of them vary over the range in which they lie.

    Probabilities are multiplied by exp(−shift) and raised to a power. Those of a nearly saturated chain would all
    be 0 or 1, and a rare one between them would change a polynomial a million times as much as usual.

    Attributes
    ----------
    shift : ndarray, shape (states, 1)
    power : float
    """

    shift: np.ndarray
    power: float

    @classmethod
    def of(cls, message: Message) -> Lens:
        """Return the lens for messages like those of many replicas."""
        finite = np.isfinite(message.log)
        held = np.where(finite, message.log, 0.0)
        shift = held.mean(axis=1, keepdims=True, where=finite | ~finite.any(axis=1, keepdims=True))
        deviation = np.where(finite, held - shift, 0.0)
        deviation -= deviation.mean(axis=0)
        return cls(shift, 1.5 / max(1.5, float(2 * np.sqrt((deviation**2).mean(axis=1).max()))))


def features(message: Message, lens: Lens) -> tuple[np.ndarray, np.ndarray]:
    """Return polynomials of the message, shape (features, replicas), and their derivatives by every tilt.

    The message is taken by its probabilities through a lens, in the form of contrasts between −1 and 1.
    """
    log, power = message.log - lens.shift, lens.power
    chance = np.exp(power * (log - log.max(axis=0)))
    chance /= chance.sum(axis=0)
    contrast = 2 * chance[:-1] - 1 if len(chance) > 2 else chance[:1] - chance[1:]
    slopes = chance * (message.first - (chance * message.first).sum(axis=1, keepdims=True))
    slope = 2 * power * slopes[:, :-1]
    degree = _DEGREE.get(len(contrast), 2)
    values: list[np.ndarray] = []
    derivatives: list[np.ndarray] = []
    for order in range(1, degree + 1):
        for chosen in combinations_with_replacement(range(len(contrast)), order):
            if len(values) == _MOST_FEATURES:
                break
            values.append(np.prod(contrast[list(chosen)], axis=0))
            total = np.zeros(slope[:, 0].shape)
            for place, i in enumerate(chosen):
                rest = [j for other, j in enumerate(chosen) if other != place]
                total = total + slope[:, i] * np.prod(contrast[rest], axis=0)
            derivatives.append(total)
    if not values:
        return np.zeros((0, chance.shape[-1])), np.zeros((0, len(message.first), chance.shape[-1]))
    return np.stack(values), np.stack(derivatives)


@dataclass(frozen=True, eq=False)
class Expected:
    """Growth averaged over the next draw, and zero-mean controls, all for one cell.

    Attributes
    ----------
    growth : Growth
        Second derivatives are left out.
    controls : ndarray, shape (features, replicas)
        φ − E φ(next).
    slopes : ndarray, shape (features, tilts, replicas)
        Derivatives of the controls.
    """

    growth: Growth
    controls: np.ndarray
    slopes: np.ndarray


def expected(message: Message, step: Steps, weights: np.ndarray, lens: Lens) -> Expected:
    """Average over the next draw of the disorder.

    Parameters
    ----------
    step : Steps
        Batch of nodes times replicas.
    weights : ndarray, shape (nodes, replicas)
    """
    count, replicas = weights.shape
    empty = Message(message.log, message.first, message.second[:0])
    after, growth = advance(empty.spread(count), Steps(step.log, step.first, step.second[:0]))

    def mean(array: np.ndarray) -> np.ndarray:
        return (array.reshape(*array.shape[:-1], count, replicas) * weights).sum(axis=-2)

    here, slopes_here = features(message, lens)
    there, slopes_there = features(after, lens)
    return Expected(
        Growth(mean(growth.value), mean(growth.first), growth.second[:, :replicas]),
        here - mean(there),
        slopes_here - mean(slopes_there),
    )


@dataclass(frozen=True, eq=False)
class Fit:
    """How a target is explained by controls.

    Attributes
    ----------
    coefficients : ndarray, shape (controls,)
    left : float
        Variance that they leave in samples to which they were not fitted.
    """

    coefficients: np.ndarray
    left: float


def fit(target: np.ndarray, controls: np.ndarray) -> Fit:
    """Find coefficients of controls, (controls, samples), that explain most of a target, (samples,).

    Used on samples other than those they come from, they leave every average unbiased and samples independent
    (S. S. Lavenberg and P. D. Welch, Manage. Sci. 27, 322 (1981), for what goes wrong otherwise; from memory).
    How many combinations of the controls are used is what explains most of the samples of even number with
    coefficients from the odd ones, and the other way round: combinations that hardly vary take coefficients
    that hold for the samples they were fitted to alone.

    Examples
    --------
    >>> noise = np.random.default_rng(0).standard_normal((1, 10))
    >>> fit(3 + 2 * noise[0], noise).coefficients.round(12)
    array([2.])
    """
    size = np.sqrt((controls**2).mean(axis=1))
    scale = np.where(size > 0, size, 1.0)
    rows = (controls / scale[:, None]).T
    halves = slice(0, None, 2), slice(1, None, 2)
    left = np.zeros(len(_CUTS))
    for half, other in (halves, halves[::-1]):
        left += (target[other] - _by_cut(target[half], rows[half]) @ rows[other].T).var(axis=1)
    best = int(np.argmin(left))
    return Fit(_by_cut(target, rows)[best] / scale, float(left[best]))


def _by_cut(target: np.ndarray, rows: np.ndarray) -> np.ndarray:
    """Return least-squares coefficients, one row for every share below which combinations are left out."""
    if not rows.size:
        return np.zeros((len(_CUTS), rows.shape[1]))
    left, variation, right = np.linalg.svd(rows - rows.mean(axis=0), full_matrices=False)
    along = left.T @ (target - target.mean()) / np.where(variation > 0, variation, 1.0)
    kept = variation > variation[0] * _CUTS[:, None]
    return np.asarray((kept * along) @ right)
