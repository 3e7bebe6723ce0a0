"""Products of many small matrices given by logarithms: all messages of a long row, block by block side by side."""

from __future__ import annotations

import math
from dataclasses import dataclass
from math import isqrt

import numpy as np

__all__ = ["Layout", "Messages", "log_chain", "log_matmul", "perron", "scan"]

#: Squarings after which a product of matrices that is still no product of two vectors is given up.
_SQUARINGS = 10
#: Logarithms that agree so closely are equal.
_ROUNDING = 4e-16
#: Stands for the logarithm of the largest of no terms at all.
_NOTHING = -1e300


@dataclass(frozen=True)
class Layout:
    """How a row of steps is laid out: step p is step p mod length of block p // length.

    Attributes
    ----------
    steps : int
        Steps of the row; what is missing in the last block is filled with units.
    """

    steps: int

    @property
    def length(self) -> int:
        """Steps of a block, about the root of their number so that blocks and steps are alike many."""
        return isqrt(max(self.steps - 1, 0)) + 1

    @property
    def blocks(self) -> int:
        """Number of blocks."""
        return -(-self.steps // self.length)

    def at(self, stored: np.ndarray, positions: np.ndarray) -> np.ndarray:
        """Return the entries of some steps of an array (length, …, blocks), step first."""
        return np.moveaxis(stored, -1, 1)[positions % self.length, positions // self.length]


@np.errstate(divide="ignore", under="ignore")
def log_matmul(first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Multiply matrices given by logarithms, shapes (rows, inner, batch) and (inner, columns, batch)."""
    joint = first[:, :, None] + second[None]
    top = np.maximum(joint.max(axis=1), _NOTHING)
    joint -= top[:, None]
    return np.asarray(np.log(np.exp(joint, out=joint).sum(axis=1)) + top)


def _scaled(table: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Take the largest entry out of every table of a batch."""
    top = np.maximum(table.max(axis=(0, 1)), _NOTHING)
    return table - top, top


def _unit(size: int, batch: int) -> np.ndarray:
    return np.repeat(np.where(np.eye(size, dtype=bool), 0.0, -np.inf)[:, :, None], batch, axis=2)


def block_products(logs: np.ndarray) -> np.ndarray:
    """Return the product of every block up to a factor, shape (rows, columns, blocks)."""
    found = _unit(logs.shape[1], logs.shape[-1])
    for step in logs:
        found, _ = _scaled(log_matmul(found, step))
    return found


def log_chain(matrices: np.ndarray) -> np.ndarray:
    """Return the product, up to a factor, of a sequence (rows, columns, sequence) of matrices by logarithms."""
    size = matrices.shape[0]
    if matrices.shape[-1] == 0:
        return _unit(size, 1)[..., 0]
    while matrices.shape[-1] > 1:
        if matrices.shape[-1] % 2:
            matrices = np.concatenate([matrices, _unit(size, 1)], axis=-1)
        matrices, _ = _scaled(log_matmul(matrices[..., 0::2], matrices[..., 1::2]))
    return np.asarray(matrices[..., 0])


def perron(product: np.ndarray) -> tuple[np.ndarray, np.ndarray] | None:
    """Return the logarithms of the left and right dominant vectors of a matrix of logarithms.

    ``None`` where powers of the matrix do not soon become a product of two vectors.
    """
    power = product[:, :, None]
    for _ in range(_SQUARINGS):
        power, _ = _scaled(log_matmul(power, power))
        table = power[..., 0]
        if np.isfinite(table).all():
            misfit = table - table[:1] - table[:, :1] + table[0, 0]
            if np.abs(misfit).max() <= _ROUNDING * max(1.0, float(np.abs(table).max())):
                return table[0] - table[0].max(), table[:, 0] - table[:, 0].max()
    return None


@dataclass(frozen=True, eq=False)
class Messages:
    """What lies before and behind every step, summed, by its logarithm up to a factor per step.

    Attributes
    ----------
    before : ndarray, shape (length, columns, states, blocks)
        Given the state of the cut before a step.
    behind : ndarray, shape (length, states, columns, blocks)
        Given the state of the cut behind it.
    log_sum : float
        Logarithm of the sum over the whole row.
    """

    before: np.ndarray
    behind: np.ndarray
    log_sum: float


def scan(logs: np.ndarray, products: np.ndarray, first: np.ndarray, last: np.ndarray) -> Messages:
    """Pass messages along a row in both directions.

    Parameters
    ----------
    logs : ndarray, shape (length, states, states, blocks)
        Logarithms of the weights of every step.
    products : ndarray, shape (states, states, blocks)
        Products of the blocks.
    first : ndarray, shape (columns, states)
        Logarithms of what comes before the row, column by column.
    last : ndarray, shape (states, columns)
        Logarithms of what comes behind it; the sum over the row runs over equal columns.
    """
    blocks = logs.shape[-1]
    starts, ends = [first], [last]
    for block in range(blocks - 1):
        starts.append(_scaled(log_matmul(starts[-1][..., None], products[..., block : block + 1]))[0][..., 0])
    for block in range(blocks - 1, 0, -1):
        ends.append(_scaled(log_matmul(products[..., block : block + 1], ends[-1][..., None]))[0][..., 0])
    before = np.empty((len(logs), *first.shape, blocks))
    behind = np.empty((len(logs), *last.shape, blocks))
    growth = np.empty((len(logs), blocks))
    now = np.stack(starts, axis=-1)
    for i, step in enumerate(logs):
        before[i] = now
        now, growth[i] = _scaled(log_matmul(now, step))
    closing = np.moveaxis(now[..., -1], 0, 1) + last
    now = np.stack(ends[::-1], axis=-1)
    for i in range(len(logs) - 1, -1, -1):
        behind[i] = now
        now, _ = _scaled(log_matmul(logs[i], now))
    top = max(float(closing.max()), _NOTHING)
    with np.errstate(divide="ignore"):
        rest = float(np.log(np.exp(closing - top).sum()))
    return Messages(before, behind, math.fsum([*growth.ravel().tolist(), top, rest]))
