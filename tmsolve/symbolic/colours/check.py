"""Comparing a closed form for any number of colours with matrices of given numbers of colours."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ...assemble.matrix import Assembled
from ...assemble.window import build_window
from ...declare.chain import Chain
from ...errors import TmsolveError
from ...tabulate.colours import plain_chain
from ...tabulate.symbolic import beta, parameter_symbols
from ..matrix import symbolic_matrix
from ..verify import evaluate, generic_points, number_value, numeric_matrix, symbol_values
from .matrix import ColourMatrix

__all__ = ["colour_mismatch", "from_symbols", "plain_matrix"]

#: Most rows of a matrix that is compared with.
_ROWS = 700
#: Agreement asked for, relative to the sum of moduli, with matrices in doubles and with blocks of many digits.
_TOLERANCE, _EXACT = 1e-9, 1e-25
_DIGITS = 50


def plain_matrix(chain: Chain, colours: int, values: Mapping[str, Fraction]) -> np.ndarray:
    """Return the transfer matrix for a number of colours in doubles, as it is assembled for numbers.

    Parameters
    ----------
    chain : Chain
        With a symbol for the number of colours.
    colours : int
        The number.
    values : mapping of str to Fraction
        Parameters and ``"T"``.
    """
    plain = plain_chain(chain, colours)
    assembled = Assembled(build_window(plain), values, 1)
    try:
        energy, log = assembled.reduced
    except TmsolveError:
        # A function may take symbols and refuse numbers, as one that calls sympy does.
        return from_symbols(plain, values)
    return np.exp((log - assembled.beta * energy)[..., 0])


def from_symbols(plain: Chain, values: Mapping[str, Fraction]) -> np.ndarray:
    """Return the transfer matrix of a chain in doubles, each entry evaluated with many digits from its formula."""
    import sympy as sp

    point = {
        symbol: sp.Rational(values[name].numerator, values[name].denominator)
        for name, symbol in parameter_symbols(plain).items()
        if name != "T" and symbol.is_Symbol
    }
    point[beta()] = sp.Rational(values["T"].denominator, values["T"].numerator)
    return np.array(numeric_matrix(symbolic_matrix(plain), point).tolist(), dtype=float)


def colour_mismatch(
    chain: Chain, matrix: ColourMatrix, eigenvalues: Sequence[tuple[Any, Any]], largest: Any
) -> str | None:
    """Compare Σ m λᵏ with traces of powers at random rational points, see `mismatch`.

    The blocks are compared with many digits, plain matrices in doubles. The numbers of colours
    are the least ones for which every representation that occurs is one, or fewer where the
    matrices would be too large: the identity holds for these too.

    Returns
    -------
    str or None
        Where they differ; ``None`` when they agree.
    """
    powers = 2 * len(eigenvalues) + 1
    for colours, point in zip(_numbers(matrix), generic_points(matrix.alphabet, 3), strict=False):
        point = {**point, matrix.number: colours}
        numbers = [(evaluate(value, point), evaluate(m, point)) for value, m in eigenvalues]
        top = evaluate(largest, point)
        if colours >= matrix.least and any(abs(x) > top * (1 + _TOLERANCE) for x, _ in numbers):
            return f"what should be the largest eigenvalue is not, at {point}"
        plain = _plain_traces(plain_matrix(chain, colours, _parameters(chain, point)), powers)
        for traces, tolerance in ((_block_traces(matrix, point, powers), _EXACT), (plain, _TOLERANCE)):
            wrong = _first_difference(numbers, traces, tolerance)
            if wrong is not None:
                return f"{wrong}, at {point}"
    return None


def _first_difference(numbers: Sequence[tuple[Any, Any]], traces: Sequence[Any], tolerance: float) -> str | None:
    import mpmath as mp

    with mp.workdps(_DIGITS):
        for k, trace in enumerate(traces, start=1):
            total = mp.fsum(m * x**k for x, m in numbers)
            size = mp.fsum(abs(m * x**k) for x, m in numbers)
            if not abs(trace - total) <= tolerance * size:
                return f"the power sum of order {k} is {mp.nstr(total, 12)}, not {mp.nstr(trace, 12)}"
    return None


def _block_traces(matrix: ColourMatrix, point: Mapping[Any, Any], powers: int) -> list[Any]:
    """Return the sums over blocks of multiplicity times trace, with many digits."""
    import mpmath as mp

    with mp.workdps(_DIGITS):
        values = symbol_values(matrix.alphabet, point)
        scale = mp.fprod(v**s for v, s in zip(values, matrix.scale, strict=False))
        traces = [mp.mpf(0)] * powers
        for block in matrix.sectors():
            size = range(block.size)
            dense = mp.matrix([[scale * number_value(block.matrix[i, j], values) for j in size] for i in size])
            power, times = mp.eye(block.size), evaluate(block.multiplicity, point)
            for k in range(powers):
                power = power * dense
                traces[k] += times * mp.fsum(power[i, i] for i in size)
        return traces


def _plain_traces(dense: np.ndarray, powers: int) -> list[Any]:
    import mpmath as mp

    scale = float(dense.sum(axis=1).max()) or 1.0
    power, traces = np.eye(len(dense)), []
    for k in range(1, powers + 1):
        power = power @ (dense / scale)
        traces.append(mp.mpf(float(np.trace(power))) * mp.mpf(scale) ** k)
    return traces


def _numbers(matrix: ColourMatrix) -> Iterator[int]:
    """Yield three numbers of colours whose matrices are small enough."""
    least = max(matrix.special, 1)
    largest = max(matrix.least + 1, least)
    while largest > least and _size(matrix, largest) > _ROWS:
        largest -= 1
    yield from (largest, max(largest - 1, least), largest)


def _size(matrix: ColourMatrix, colours: int) -> int:
    return int(matrix.rows.subs(matrix.number, colours))


def _parameters(chain: Chain, point: dict[Any, Any]) -> dict[str, Fraction]:
    """Return exact values for all parameters and T; what does not occur in the matrix is 1."""
    values = dict.fromkeys((*chain.parameters, "T"), Fraction(1))
    for symbol, value in point.items():
        number = Fraction(str(value))
        values["T" if symbol.name == "beta" else symbol.name] = 1 / number if symbol.name == "beta" else number
    values |= {name: value for name, value in chain.fixed.items() if isinstance(value, Fraction)}
    return {name: values[name] for name in (*chain.parameters, "T")}
