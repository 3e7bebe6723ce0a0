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

__all__ = ["Expected", "coefficients", "expected", "features"]

#: Degrees and number of polynomials of the message.
_DEGREE = {1: 7, 2: 4, 3: 3}
_MOST_FEATURES = 16
#: Combinations of controls that vary by less than this share of the largest are rounding.
_SINGULAR = 1e-12


def features(message: Message, power: float = 1.0) -> tuple[np.ndarray, np.ndarray]:
    """Return polynomials of the message, shape (features, replicas), and their derivatives by every tilt.

    The message is taken by its probabilities, in the form of contrasts between −1 and 1.
    """
    chance = np.exp(power * (message.log - message.log.max(axis=0)))
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


def expected(message: Message, step: Steps, weights: np.ndarray, power: float = 1.0) -> Expected:
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

    here, slopes_here = features(message, power)
    there, slopes_there = features(after, power)
    return Expected(
        Growth(mean(growth.value), mean(growth.first), growth.second[:, :replicas]),
        here - mean(there),
        slopes_here - mean(slopes_there),
    )


def coefficients(target: np.ndarray, controls: np.ndarray) -> np.ndarray:
    """Return the coefficients of controls, shape (controls,), that explain most of a target, shape (samples,).

    Used on samples other than those they come from, they leave every average unbiased and samples independent
    (S. S. Lavenberg and P. D. Welch, Manage. Sci. 27, 322 (1981), for what goes wrong otherwise; from memory).

    Examples
    --------
    >>> noise = np.random.default_rng(0).standard_normal((1, 10))
    >>> coefficients(3 + 2 * noise[0], noise).round(12)
    array([2.])
    """
    size = np.sqrt((controls**2).mean(axis=1))
    scale = np.where(size > 0, size, 1.0)
    rows = (controls / scale[:, None]).T
    inverse = np.linalg.pinv(rows - rows.mean(axis=0), rcond=_SINGULAR)
    return np.asarray(inverse @ (target - target.mean()) / scale)
