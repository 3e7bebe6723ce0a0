"""Products of matrices of long numbers: by python-flint where it is installed and pays, else entry by entry."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any

import numpy as np

from ..operators.midpoints import flint_module, flint_precision
from ..operators.numbers import Numbers
from ..operators.product import repeated

__all__ = ["matrix_power", "matrix_product", "speed"]

#: Smaller matrices are not worth the conversion.
_SMALLEST = 6
#: Bits beyond those of the numbers: the balls of a product of N matrices grow by about a bit per doubling.
_GUARD = 64
#: How many times quicker products of numbers up to so many bits are, as measured for 10 to 20 states.
_QUICKER = ((256, 50), (2048, 15))


def speed(size: int, bits: int) -> int:
    """Return how many times quicker products of matrices of a size are than entry by entry."""
    if size < _SMALLEST or flint_module() is None:
        return 1
    return next((times for limit, times in _QUICKER if bits <= limit), 1)


def matrix_power(numbers: Numbers, matrix: np.ndarray, count: int) -> np.ndarray:
    """Return a power ≥ 1 of a square matrix of numbers of mpmath.

    Examples
    --------
    >>> from tmsolve.operators.numbers import multiprecision
    >>> numbers = multiprecision(100)
    >>> int(matrix_power(numbers, numbers.array([[1, 1], [1, 0]]), 100)[0, 1])          # a number of Fibonacci
    354224848179261915075
    """
    if count == 1:
        return matrix
    if speed(len(matrix), numbers.bits) == 1:
        join: Callable[[Any, Any], Any] = partial(np.matmul)
        result: np.ndarray = repeated(join, matrix, count)
        return result
    flint = flint_module()
    with flint_precision(numbers.bits + _GUARD, flint.ctx):
        return _numbers(_balls(matrix, flint) ** count, numbers)


def matrix_product(numbers: Numbers, first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """Return the product of two matrices of numbers of mpmath."""
    if min(*first.shape, *second.shape) < _SMALLEST or flint_module() is None:
        return np.asarray(first @ second)
    flint = flint_module()
    with flint_precision(numbers.bits + _GUARD, flint.ctx):
        return _numbers(_balls(first, flint) * _balls(second, flint), numbers)


def _balls(matrix: np.ndarray, flint: Any) -> Any:
    return flint.arb_mat([[_ball(entry._mpf_, flint) for entry in row] for row in matrix])


def _ball(raw: tuple[int, Any, int, int], flint: Any) -> Any:
    sign, mantissa, exponent, _ = raw
    return flint.arb((-int(mantissa) if sign else int(mantissa), int(exponent)))


def _numbers(table: Any, numbers: Numbers) -> np.ndarray:
    """Return midpoints as numbers of mpmath, rounded to their length."""
    context = type(numbers.scalar(1)).context
    result = np.empty((table.nrows(), table.ncols()), dtype=object)
    for place in np.ndindex(result.shape):
        mantissa, exponent = table[place].mid().man_exp()
        result[place] = +context.ldexp(context.mpf(int(mantissa)), int(exponent))
    return result
