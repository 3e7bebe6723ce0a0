"""NumPy source for the thermodynamics of a block of one or two rows.

The logarithm of the Perron root and its first two derivatives by β are put together from sums
of positive weights, in which mean and variance of the levels appear as such; nothing of
order 1 is subtracted to leave something exponentially small.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction
from typing import Any

from ...tabulate.symbolic import beta
from ..alphabet import Laurent
from ..formula import rational
from ..spectrum import Factor, Spectrum

__all__ = ["level_lines"]


def level_lines(spectrum: Spectrum, factor: Factor, printed: Callable[[Any], str]) -> list[str] | None:
    """Return lines that compute ``level``, the Perron root as (log, slope, curvature, entropy), or None.

    Parameters
    ----------
    spectrum, factor : Spectrum, Factor
        The factor that holds the Perron root.
    printed : callable
        Writes an expression without exponentials as Python.
    """
    block = factor.block
    if factor.degree != block.size or block.size > 2 or not block.positive:
        return None
    matrix = spectrum.matrix
    entries = block.matrix
    if block.size == 1:
        sums = [matrix.laurent(entries[0, 0])]
    else:
        sums = [matrix.laurent(entries[0, 0]), matrix.laurent(entries[1, 1])]
        sums.append(matrix.laurent(entries[0, 1] * entries[1, 0], 2))
    if any(c <= 0 for laurent in sums for c in laurent.values()) or not sums[-1]:
        return None
    classes = matrix.alphabet.classes
    if block.size == 1:
        return _sum_lines("level", sums[0], classes, printed)
    lines = []
    for name, laurent in zip(("a", "d", "bc"), sums, strict=True):
        lines += _sum_lines(f"_{name}", laurent, classes, printed)
    if not sums[0] and not sums[1]:
        return [*lines, "level = [0.5 * part for part in _bc]"]
    return [*lines, "level = _larger_root(_a, _d, _bc, beta)"]


def _sum_lines(name: str, laurent: Laurent, classes: tuple[Any, ...], printed: Callable[[Any], str]) -> list[str]:
    if not laurent:
        return [f"{name} = (-numpy.inf, 0.0, 0.0, 0.0)"]
    lines = [f"{name} = _sum("]
    for exponents, c in sorted(laurent.items(), reverse=True):
        lines.append(f"    ({', '.join(_level(exponents, c, classes, printed))}),")
    return [*lines, ")"]


def _level(
    exponents: tuple[Fraction, ...], c: Fraction, classes: tuple[Any, ...], printed: Callable[[Any], str]
) -> list[str]:
    import sympy as sp

    inside = sp.Add(*(rational(e) * key for e, key in zip(exponents, classes, strict=False)))
    slope = sp.expand(sp.diff(inside, beta()))
    number = sp.log(rational(c))
    # β times one sum of energies: differences of energies are formed before they grow.
    log = sp.Mul(beta(), slope, evaluate=False) if sp.expand(inside - beta() * slope) == 0 else inside
    parts = [printed(log if c == 1 else sp.Add(number, log, evaluate=False)), printed(slope)]
    parts += [printed(sp.diff(slope, beta())), printed(number + sp.expand(inside - beta() * slope))]
    return parts
