"""The transfer matrix at low temperature: cheapest steps first, everything else in powers of a small x.

With x = exp(−β ε) and potentials that make every step cost at least the least mean cost of a
cycle, a matrix of Boltzmann factors is e^{−β E₀} (M₀ + x M₁ + x² M₂ + …) up to a diagonal
similarity; M₀ counts the steps of the ground states.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ...errors import NotApplicable, listing
from ...maxplus.exact import cheapest_cycles
from ...tabulate.symbolic import beta
from .matrix import ExponentialMatrix, Part
from .root import Rows, strong_parts

__all__ = ["Balanced", "balanced_classes", "counted_steps"]


@dataclass(frozen=True, eq=False)
class Balanced:
    """One class of states that reach each other.

    Attributes
    ----------
    matrix : ExponentialMatrix
        Restricted to the class.
    exponents : list
        Per exponential of the matrix (part, row, column, power of x, exponents, coefficient).
    quantum : sympy number
        Unit of the energies below.
    ground : Fraction
        E₀ per cell.
    step : Fraction
        ε.
    """

    matrix: ExponentialMatrix
    exponents: list[tuple[Part, int, int, int, tuple[Any, ...], Any]]
    quantum: Any
    ground: Fraction
    step: Fraction

    @property
    def moves(self) -> bool:
        """Whether anything depends on x."""
        return any(power for _, _, _, power, *_ in self.exponents)


def balanced_classes(matrix: ExponentialMatrix) -> list[Balanced]:
    """Return the classes of states with the least energy per cell.

    Raises
    ------
    NotApplicable
        Parameters are free, energies have no common measure, or every configuration is forbidden.
    """
    quantum, place = _quantum(matrix)
    present: Rows = [{} for _ in range(matrix.size)]
    for i, j in matrix.parts.get((0, 0), {}):
        present[i][j] = 1
    found = []
    if any(present):
        for states in strong_parts(present):
            balanced = _balanced(matrix.restricted(states), quantum, place)
            if balanced is not None:
                found.append(balanced)
    if not found:
        raise NotApplicable(
            "every configuration of this chain is forbidden: no two states can follow each other for ever; check which "
            "energies are math.inf and which weights are 0"
        )
    least = min(item.ground for item in found)
    return [item for item in found if item.ground == least]


def _quantum(matrix: ExponentialMatrix) -> tuple[Any, dict[int, Fraction]]:
    """Return a positive number of which all energies are rational multiples, and the multiples of the classes."""
    import sympy as sp

    rates = {k: key / beta() for k, key in enumerate(matrix.classes) if beta() in key.free_symbols}
    free = sorted({str(symbol) for rate in rates.values() for symbol in rate.free_symbols})
    weights = sorted({str(s) for k, key in enumerate(matrix.classes) if k not in rates for s in key.free_symbols})
    names = [*free, *(w for w in weights if w not in free and _weighs(matrix, w))]
    if names:
        raise NotApplicable(
            f"at low temperature the ground state depends on the values of {listing(names)}; fix them at exact numbers "
            f"with chain.fix({'=…, '.join(names)}=…){_one_scale(names, list(rates.values()))}"
        )
    if not rates:
        return sp.Integer(1), {}
    first = next(iter(rates.values()))
    quantum = first if first.is_positive else -first
    place = {}
    for k, rate in rates.items():
        ratio = sp.nsimplify(sp.radsimp(sp.simplify(rate / quantum)))
        if not ratio.is_Rational:
            raise NotApplicable(
                f"the energies {quantum} and {rate} have no common measure, so that their Boltzmann factors are not "
                "powers of one variable; a series at low temperature takes energies that are rational multiples of "
                "each other"
            )
        place[k] = Fraction(int(ratio.p), int(ratio.q))
    return quantum, place


def _one_scale(names: Sequence[str], rates: Sequence[Any]) -> str:
    """Say what is enough where all energies are multiples of one parameter."""
    (name, *others) = names
    if others or any(str(rate.as_coeff_Mul(rational=True)[1]) != name for rate in rates):
        return ""
    return (
        f": all energies are multiples of {name}, so that chain.fix({name}=1) stands for every {name} > 0, and "
        f"chain.fix({name}=-1) for every {name} < 0, with beta*|{name}| for beta"
    )


def _weighs(matrix: ExponentialMatrix, name: str) -> bool:
    """Whether a symbol occurs in the weights, not only in observables."""
    columns = [k for k, key in enumerate(matrix.classes) if name in {str(s) for s in key.free_symbols}]
    return any(part == (0, 0) and any(x[k] for k in columns) for part, _, _, x, _ in matrix.terms())


def _balanced(matrix: ExponentialMatrix, quantum: Any, place: dict[int, Fraction]) -> Balanced | None:
    costs = [-sum((place[k] * x[k] for k in place), Fraction(0)) for *_, x, _ in matrix.terms()]
    unit = Fraction(1, math.lcm(*(cost.denominator for cost in costs))) if costs else Fraction(1)
    whole = [int(cost / unit) for cost in costs]
    terms = list(matrix.terms())
    steps = [(i, j, cost) for (part, i, j, *_), cost in zip(terms, whole, strict=True) if part == (0, 0)]
    least: dict[tuple[int, int], int] = {}
    for i, j, cost in steps:
        least[i, j] = min(cost, least.get((i, j), cost))
    if not least:
        return None
    rows, cols = np.array(list(least), dtype=np.intp).T
    found = cheapest_cycles(rows, cols, np.array(list(least.values()), dtype=object), matrix.size)
    if found is None:
        return None
    potentials = [int(v) for v in found.potentials]
    shift = int(found.mean * found.unit)
    powers = [
        cost * found.unit - shift + potentials[i] - potentials[j]
        for (_, i, j, *_), cost in zip(terms, whole, strict=True)
    ]
    divisor = math.gcd(*powers) or 1
    exponents = [(part, i, j, power // divisor, x, c) for (part, i, j, x, c), power in zip(terms, powers, strict=True)]
    return Balanced(matrix, exponents, quantum, found.mean * unit, unit * Fraction(divisor, found.unit))


def counted_steps(balanced: Balanced, numbers: Sequence[Any]) -> Rows:
    """Return M₀ from the coefficients of all exponentials."""
    rows: Rows = [{} for _ in range(balanced.matrix.size)]
    for (part, i, j, power, *_), c in zip(balanced.exponents, numbers, strict=True):
        if part == (0, 0) and power == 0:
            rows[i][j] = rows[i][j] + c if j in rows[i] else c
    return rows
