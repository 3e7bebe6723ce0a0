"""Numerical proof-reading of a closed form before anybody sees it."""

from __future__ import annotations

import math
import random
from collections.abc import Iterator, Mapping, Sequence
from functools import lru_cache
from typing import Any

import numpy as np

from ..errors import NotApplicable, listing
from .alphabet import Alphabet
from .boltzmann import Terms
from .matrix import SymbolicMatrix

__all__ = ["evaluate", "generic_points", "has_weights", "mismatch", "number_value", "numeric_matrix", "symbol_values"]

_DIGITS = 50
#: Numbers of colours at generic points.
_COUNTS = 20, 60
#: Random points tried for each one that is found.
_ATTEMPTS = 400
#: Agreement asked for, relative to the sum of moduli; what a formula may lose to cancellation is below it.
_TOLERANCE = 1e-25


def generic_points(alphabet: Alphabet, count: int, seed: int = 7) -> Iterator[dict[Any, Any]]:
    """Yield rational values for the parameters and β of an alphabet, with every ln w defined.

    Parameters that occur as weights come out positive, the others with either sign; numbers of
    colours come out whole and larger than any number of sites in a cut.

    Raises
    ------
    NotApplicable
        No values were found at which every weight is positive.
    """
    import sympy as sp

    draw = random.Random(seed)
    symbols = sorted(set().union(*(key.free_symbols for key in alphabet.classes)), key=str)
    positive = {s for w in _bases(alphabet) for s in w.free_symbols} | {s for s in symbols if s.is_positive}
    for _ in range(count):
        for attempt in range(_ATTEMPTS):
            # Weights such as 1 − w are positive for small parameters.
            most = 10 if alphabet.mixed and attempt % 2 else 17
            signs = {s: 1 if s in positive else draw.choice((1, -1)) for s in symbols}
            point = {s: sp.Rational(signs[s] * draw.randint(2 if most > 10 else 1, most), 11) for s in symbols}
            point |= {s: sp.Integer(draw.randint(*_COUNTS)) for s in alphabet.counts}
            if has_weights(alphabet, point):
                yield point
                break
        else:
            raise NotApplicable(
                f"no values of {listing(map(str, symbols))} were found at which all weights are positive, so that "
                "formulas cannot be compared with the matrix; check the signs of the weights, or fix parameters with "
                "chain.fix(…)"
            )


def has_weights(alphabet: Alphabet, point: Mapping[Any, Any]) -> bool:
    """Whether every weight of an alphabet is defined and positive at rational values of its symbols."""
    if not all(base.subs(point).is_positive for base in _bases(alphabet)):
        return False
    return all(_weight(terms, point) > 0 for terms in alphabet.mixed)


def _bases(alphabet: Alphabet) -> list[Any]:
    import sympy as sp

    return [key.args[0] for key in alphabet.classes if isinstance(key, sp.log)]


def _weight(terms: Terms, point: Mapping[Any, Any]) -> float:
    total = 0.0
    for monomial, c in terms.items():
        total += float(c) * math.exp(sum(float(key.subs(point)) * float(exponent) for key, exponent in monomial))
    return total


def evaluate(expr: Any, point: Mapping[Any, Any], digits: int = _DIGITS) -> Any:
    """Return an expression at a point as an mpmath number."""
    import mpmath as mp
    import sympy as sp

    function = _function(tuple(point), expr)
    with mp.workdps(digits + 10):
        values = [sp.Rational(v) for v in point.values()]
        return mp.mpmathify(function(*(mp.mpf(int(v.p)) / int(v.q) for v in values)))


@lru_cache(maxsize=32)
def _function(symbols: tuple[Any, ...], expr: Any) -> Any:
    """Return an expression as a function of mpmath numbers; writing it costs more than calling it."""
    import sympy as sp

    return sp.lambdify(symbols, expr, modules="mpmath")


def symbol_values(alphabet: Alphabet, point: Mapping[Any, Any], digits: int = _DIGITS) -> list[Any]:
    """Return the symbols of an alphabet, y = exp(unit · class), at a point as mpmath numbers."""
    import mpmath as mp

    with mp.workdps(digits + 10):
        classes = [evaluate(key, point, digits) for key in alphabet.classes]
        units = [mp.mpf(u.numerator) / u.denominator for u in alphabet.units]
        return [mp.exp(c * u) for c, u in zip(classes, units, strict=True)]


def number_value(element: Any, values: Sequence[Any]) -> Any:
    """Return a polynomial at values of its symbols."""
    import mpmath as mp

    total = mp.mpf(0)
    for powers, c in element.terms():
        term = mp.mpf(int(c.numerator)) / int(c.denominator)
        for value, power in zip(values, powers, strict=False):
            term *= value**power
        total += term
    return total


def numeric_matrix(matrix: SymbolicMatrix, point: Mapping[Any, Any], digits: int = _DIGITS) -> Any:
    """Return the matrix at a point, its scale included, as an mpmath matrix."""
    import mpmath as mp

    with mp.workdps(digits + 10):
        values = symbol_values(matrix.alphabet, point, digits)
        scale = mp.fprod(v**s for v, s in zip(values, matrix.scale, strict=False))
        result = mp.zeros(matrix.size)
        for (i, j), element in np.ndenumerate(_hidden(matrix.entries)):
            result[i, j] = scale * number_value(element.value, values)
        return result


class _Held:
    """Keeps numpy from looking into a polynomial, which is a dict."""

    __slots__ = ("value",)

    def __init__(self, value: Any) -> None:
        self.value = value


def _hidden(entries: np.ndarray) -> np.ndarray:
    held = np.empty(entries.shape, dtype=object)
    for index in np.ndindex(entries.shape):
        held[index] = _Held(entries[index])
    return held


def mismatch(
    matrix: SymbolicMatrix, eigenvalues: Sequence[tuple[Any, int]], largest: Any, points: int = 3
) -> str | None:
    """Compare Σ λᵏ with the trace of the k-th power at random rational points.

    The power sums for k = 1 … n determine the spectrum with its multiplicities. The ``largest``
    eigenvalue has to have the largest modulus as well.

    Returns
    -------
    str or None
        Where they differ; ``None`` when they agree.
    """
    import mpmath as mp

    for point in generic_points(matrix.alphabet, points):
        with mp.workdps(_DIGITS):
            numbers = [(evaluate(expr, point), m) for expr, m in eigenvalues]
            dense = numeric_matrix(matrix, point)
            top = evaluate(largest, point)
            if any(abs(x) > top * (1 + _TOLERANCE) for x, _ in numbers):
                return f"what should be the largest eigenvalue is not, at {point}"
            power = mp.eye(matrix.size)
            for k in range(1, matrix.size + 1):
                power = power * dense
                trace = mp.fsum(power[i, i] for i in range(matrix.size))
                total = mp.fsum(m * x**k for x, m in numbers)
                size = mp.fsum(m * abs(x) ** k for x, m in numbers)
                if not abs(trace - total) <= _TOLERANCE * size:
                    return f"the power sum of order {k} is {mp.nstr(total, 12)}, not {mp.nstr(trace, 12)}, at {point}"
    return None
