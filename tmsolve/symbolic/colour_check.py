"""Comparing a closed form for any number of colours with matrices of given numbers of colours."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import build_window
from ..declare.chain import Chain
from ..errors import TmsolveError
from ..tabulate.colours import plain_chain
from ..tabulate.symbolic import beta, parameter_symbols
from .colour_matrix import ColourMatrix
from .matrix import symbolic_matrix
from .verify import evaluate, generic_points, numeric_matrix

__all__ = ["colour_mismatch", "from_symbols", "plain_matrix"]

#: Most rows of a matrix that is compared with.
_ROWS = 700
#: Agreement asked for, relative to the sum of moduli; the matrices are in doubles.
_TOLERANCE = 1e-9


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
    """Compare Σ m λᵏ with traces of powers of plain matrices at random rational points, see `mismatch`.

    The numbers of colours are the least ones for which every representation that occurs is one,
    or fewer where the matrices would be too large: the identity holds for these too.

    Returns
    -------
    str or None
        Where they differ; ``None`` when they agree.
    """
    import mpmath as mp

    powers = 2 * len(eigenvalues) + 1
    points = generic_points(matrix.alphabet, 4)
    for colours, point in zip(_numbers(matrix), points, strict=False):
        point = {**point, matrix.number: colours}
        numbers = [(evaluate(value, point), evaluate(m, point)) for value, m in eigenvalues]
        top = evaluate(largest, point)
        if colours >= matrix.least and any(abs(x) > top * (1 + _TOLERANCE) for x, _ in numbers):
            return f"what should be the largest eigenvalue is not, at {point}"
        dense = plain_matrix(chain, colours, _parameters(chain, point))
        scale = float(dense.sum(axis=1).max()) or 1.0
        dense, power = dense / scale, np.eye(len(dense))
        for k in range(1, powers + 1):
            power = power @ dense
            total = mp.fsum(m * (x / scale) ** k for x, m in numbers)
            size = mp.fsum(abs(m * (x / scale) ** k) for x, m in numbers)
            if not abs(np.trace(power) - total) <= _TOLERANCE * size:
                return f"the power sum of order {k} is {mp.nstr(total, 12)}, not {np.trace(power)}, at {point}"
    return None


def _numbers(matrix: ColourMatrix) -> Iterator[int]:
    """Yield numbers of colours, with all representations where matrices of that many colours are small enough."""
    import sympy as sp

    least = max(matrix.special, 1)
    wanted = [matrix.least + 1, max(matrix.least, least), least + 1, least]
    sizes = {q: int(sp.Integer(matrix.rows.subs(matrix.number, q))) for q in wanted}
    largest = next((q for q in range(max(wanted), least, -1) if _size(matrix, q) <= _ROWS), least)
    yield from dict.fromkeys(min(q, largest) for q in wanted if sizes[q])


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
