"""Whether the logarithms of Wᵇ lie in the span of a chain's own terms.

Entries of Wᵇ are products of polynomials in Boltzmann factors without common divisors. The
logarithms of different ones are independent, so that ln Wᵇ is of the chain's own form, for all parameters,
just when the table of exponents of each single factor is; that is a linear system with
whole numbers.
"""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import Any

import numpy as np

from ..alphabet import Laurent
from .exact_system import solve_exactly
from .fit import Basis
from .recursion_factors import Factored, Key, factor_all
from .recursion_tables import WeightTable

__all__ = ["Closure", "Image", "close_family", "own_weight"]


@dataclass(eq=False)
class Image:
    """A renormalised coordinate: Σ shares · ln factor + Σ powers · class + Σ primes · ln prime.

    Attributes
    ----------
    factors : dict
        Sums of exponentials, with their shares.
    powers : dict of int to Fraction
        Own classes, by their place in the alphabet.
    primes : dict of int to Fraction
        Prime numbers.
    """

    factors: dict[Key, Fraction] = field(default_factory=dict)
    powers: dict[int, Fraction] = field(default_factory=dict)
    primes: dict[int, Fraction] = field(default_factory=dict)


@dataclass(frozen=True, eq=False)
class Closure:
    """What the linear system says.

    Attributes
    ----------
    coordinates : tuple of int
        Classes that are renormalised, by their place in the alphabet.
    held : tuple of int
        Classes that change nothing but the constant or the gauge, or act like others.
    images : dict of int to Image
        Renormalised coordinates.
    constant : Image
        Logarithm of the constant that multiplies the renormalised matrix.
    missing : tuple of str
        Couplings that are created and not among the chain's terms; if any, there are no images.
    """

    coordinates: tuple[int, ...]
    held: tuple[int, ...]
    images: dict[int, Image]
    constant: Image
    missing: tuple[str, ...]


def close_family(table: WeightTable, b: int) -> Closure:
    """Solve for the renormalised coordinates of a chain, or find what is missing."""
    power = {pair: laurent for pair, laurent in table.power(b).items() if laurent is not None}
    changed = [pair for pair in table.pairs if (pair in power) != (pair in table.weights)]
    pairs = [pair for pair in table.pairs if pair in power and pair in table.weights]
    own = {pair: own_weight(table, pair) for pair in pairs}
    classes = [k for k in range(len(table.alphabet.classes)) if any(own[pair][1].get(k) for pair in pairs)]
    gauge = sorted({table.kind(i) for pair in pairs for i in pair})[:-1]
    columns = [[Fraction(1)] * len(pairs)]
    columns += [[Fraction((table.kind(j) == a) - (table.kind(i) == a)) for i, j in pairs] for a in gauge]
    start = len(columns)
    columns += [[own[pair][1].get(k, Fraction(0)) for pair in pairs] for k in classes]
    known, independent = factor_all(table.alphabet, (power[pair] for pair in pairs))
    targets = _targets(table, pairs, power, own, known)
    solved = solve_exactly(columns, targets)
    if solved.impossible and not independent:
        # What large sums share may make up for it.
        known, _ = factor_all(table.alphabet, (power[pair] for pair in pairs), split=True)
        targets = _targets(table, pairs, power, own, known)
        solved = solve_exactly(columns, targets)
    pivots = {column: classes[column - start] for column in solved.pivots if column >= start}
    held = tuple(k for k in classes if k not in pivots.values())
    if solved.impossible or changed:
        missing = [f"[{table.label(i)}|{table.label(j)}]" for i, j in changed]
        missing += _missing(table, pairs, columns, [targets[name] for name in solved.impossible])
        return Closure(tuple(pivots.values()), held, {}, Image(), tuple(dict.fromkeys(missing)))
    # A class that cannot be told apart keeps its value; the others then take what is left.
    own_rest = solve_exactly(columns, {k: columns[start + classes.index(k)] for k in held})
    images = {k: _image(solved.coefficients, own_rest.coefficients, column) for column, k in pivots.items()}
    return Closure(tuple(pivots.values()), held, images, _image(solved.coefficients, own_rest.coefficients, 0), ())


def _image(found: Mapping[Any, dict[int, Fraction]], held: Mapping[Any, dict[int, Fraction]], column: int) -> Image:
    image = Image()
    places: dict[str, Any] = {"factor": image.factors, "class": image.powers, "prime": image.primes}
    for (what, name), coefficients in found.items():
        if coefficients.get(column):
            places[what][name] = coefficients[column]
    for k, coefficients in held.items():
        share = image.powers.get(k, Fraction(0)) - coefficients.get(column, Fraction(0))
        if share:
            image.powers[k] = share
    return image


def own_weight(table: WeightTable, pair: tuple[int, int]) -> tuple[Fraction, dict[int, Fraction]]:
    """Return number and exponents of one weight."""
    ((monomial, c),) = table.weights[pair].items()
    exponents = dict(monomial)
    return c, {k: exponents[key] for k, key in enumerate(table.alphabet.classes) if key in exponents}


def _targets(
    table: WeightTable,
    pairs: list[tuple[int, int]],
    power: Mapping[tuple[int, int], Laurent],
    own: Mapping[tuple[int, int], tuple[Fraction, dict[int, Fraction]]],
    known: Mapping[Key, Factored],
) -> dict[tuple[str, Any], list[Fraction]]:
    """Return exponents of every factor, class and prime over the pairs."""
    targets: dict[tuple[str, Any], list[Fraction]] = {}

    def add(what: str, name: Any, row: int, exponent: Fraction | int) -> None:
        if exponent:
            column = targets.setdefault((what, name), [Fraction(0)] * len(pairs))
            column[row] += exponent

    for row, pair in enumerate(pairs):
        product = known[frozenset(power[pair].items())]
        for sign, c in ((1, product.number), (-1, own[pair][0])):
            for prime, times in _primes(c).items():
                add("prime", prime, row, sign * times)
        for k, exponent in enumerate(product.monomial[: len(table.alphabet.classes)]):
            add("class", k, row, exponent)
        for factor, times in product.factors:
            add("factor", factor, row, times)
    return targets


def _primes(c: Fraction) -> dict[int, int]:
    from sympy import factorint

    return {int(p): int(e) for p, e in factorint(c.numerator).items() if p > 1} | {
        int(p): -int(e) for p, e in factorint(c.denominator).items() if p > 1
    }


def _missing(
    table: WeightTable,
    pairs: list[tuple[int, int]],
    columns: list[list[Fraction]],
    targets: list[list[Fraction]],
) -> list[str]:
    """Name the simplest couplings that make every target possible."""
    if not targets:
        return []
    if table.others is not None:
        return [f"[{table.label(i)}|{table.label(j)}]" for i, j in _single_pairs(pairs, columns, targets)]
    n = table.size
    rows = np.zeros((n, n), dtype=bool)
    rows[tuple(np.array(pairs).T)] = True

    def spread(column: list[Fraction]) -> np.ndarray:
        full = np.zeros((n, n))
        full[tuple(np.array(pairs).T)] = [float(c) for c in column]
        return full

    basis = Basis(rows)
    for column in columns:
        basis.add(spread(column))
    for name, candidate in table.cuts.couplings():
        if not basis.is_full:
            basis.add(candidate, name)
    found, _ = basis.solve(np.stack([spread(target)[rows] for target in targets], axis=-1))
    return [name for name, value in zip(basis.names, found, strict=True) if name and np.abs(value).max() > 1e-9]


def _single_pairs(
    pairs: list[tuple[int, int]], columns: list[list[Fraction]], targets: list[list[Fraction]]
) -> list[tuple[int, int]]:
    """Return a smallest set of single pairs whose own energies make every target possible."""
    units = {pair: [Fraction(other == pair) for other in pairs] for pair in pairs if pair[0] <= pair[1]}
    for count in range(1, len(units) + 1):
        for chosen in itertools.combinations(units, count):
            both = [_either(units, pairs, pair) for pair in chosen]
            if not solve_exactly([*columns, *both], dict(enumerate(targets))).impossible:
                return list(chosen)
    return list(units)


def _either(units: Any, pairs: list[tuple[int, int]], pair: tuple[int, int]) -> list[Fraction]:
    return [Fraction(other in (pair, pair[::-1])) for other in pairs]
