"""Fixed points of decimation, all of them, with the eigenvalues of the linearised map.

Written symmetrically and divided by the largest eigenvalue, a renormalised matrix is the power
Mᵇ, so that a fixed point is a matrix with Mᵇ = M: its eigenvalues are 0 and 1 (and −1 for odd
b). Without negative entries it is a sum of blocks v vᵀ over disjoint sets of states, one for
each phase that coexists; with −1, a block alternates between two sets. These are finitely many
kinds, each with a continuous choice of v. A perturbation between eigenvectors with eigenvalues
t and u grows by Σ tᵏ uᵇ⁻¹⁻ᵏ, hence by b, 1 or 0: relevant with exponent y = 1, marginal, or gone
at once (D. R. Nelson and M. E. Fisher, Ann. Phys. 91, 226 (1975); S. Krinsky and D. Furman, Phys.
Rev. B 11, 2602 (1975); from memory).
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ...errors import NotApplicable, TooLargeError
from .recursion import Recursion
from .recursion_closure import own_weight

__all__ = ["FixedPoint", "fixed_points"]

#: States; the partitions of more are too many.
_STATES = 7
#: A residual below which an iteration has found a vector.
_FOUND = 1e-13

#: A phase: the set of its states, or two sets that alternate.
Phase = tuple[tuple[int, ...], ...]


@dataclass(frozen=True, eq=False, repr=False)
class FixedPoint:
    """Weights that decimation leaves as they are.

    Attributes
    ----------
    phases : tuple of tuple of str
        States of each phase that coexists, ``A | B`` where a phase alternates between two sets.
    weights : ndarray, shape (n, n)
        One such matrix, symmetric, with largest eigenvalue 1; a zero is an infinite energy.
    freedom : int
        Dimension of the set of fixed points that it belongs to.
    eigenvalues : tuple of float
        Of the linearised map in the space of the couplings, largest first.
    exponents : tuple of float
        y = ln Λ/ln b: 1 relevant, 0 marginal, −inf gone after one step.
    """

    phases: tuple[tuple[str, ...], ...]
    weights: np.ndarray
    freedom: int
    eigenvalues: tuple[float, ...]
    exponents: tuple[float, ...]

    def __repr__(self) -> str:
        phases = " ".join("{" + ", ".join(phase).replace(", |, ", " | ") + "}" for phase in self.phases)
        free = f", a set of dimension {self.freedom}" if self.freedom else ""
        return f"<FixedPoint {phases}: eigenvalues {', '.join(f'{x:g}' for x in self.eigenvalues)}{free}>"


def fixed_points(step: Recursion) -> list[FixedPoint]:
    """Return every fixed point of a recursion, zero and infinite temperature included.

    Parameters
    ----------
    step : Recursion
        Of a chain with a given number of states, up to 7, that looks the same from both ends.

    Returns
    -------
    list of FixedPoint
        The most stable first.

    Raises
    ------
    NotApplicable
        A symbolic number of colours, a chain that does not look the same from both ends, or couplings
        that fill only part of the tables with the symmetry of the chain.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> from tmsolve.symbolic.decimation.recursion import recursion
    >>> fixed_points(recursion(Chain(ising(), [bond(lambda s, t, J: -J*s*t)])))
    [<FixedPoint {-1, 1}: eigenvalues 0>, <FixedPoint {-1} {1}: eigenvalues 2>]
    """
    space = _space(step)
    found = []
    for phases in _partitions(len(space[0]), odd=step.b % 2 == 1):
        vectors = _vectors(phases, space)
        if vectors is not None:
            found.append(_fixed_point(step, phases, *vectors, space))
    return sorted(found, key=lambda point: (point.eigenvalues, len(point.phases)))


def _space(step: Recursion) -> list[np.ndarray]:
    """Return the classes of pairs of states with equal weights, as symmetric tables of 0 and 1."""
    table = step.table
    if table.others is not None:
        raise NotApplicable(
            f"fixed points are found state by state, and the number of colours, {table.number}, is a symbol; "
            "derive the recursion for a number, as in colours(3)"
        )
    n = table.size
    if n > _STATES:
        raise TooLargeError(f"the cut has {n} states; fixed points are found for up to {_STATES}", limit=_STATES)
    own = {pair: own_weight(table, pair) for pair in table.weights}
    _check_two_ways(own, n)
    classes: dict[Any, np.ndarray] = {}
    for i, j in own:
        (c, here), (d, there) = own[i, j], own[j, i]
        exponents = frozenset((k, e) for k in {*here, *there} if (e := here.get(k, 0) + there.get(k, 0)))
        classes.setdefault((c * d, exponents), np.zeros((n, n)))[i, j] = 1
    couplings = len(step.closure.coordinates)
    if len(classes) != couplings + 1:
        raise NotApplicable(
            f"the {couplings} couplings of this chain fill only part of the {len(classes)} dimensions of the tables "
            "with its symmetry; give every coupling that the symmetry allows a term of its own"
        )
    return list(classes.values())


def _check_two_ways(own: dict[tuple[int, int], tuple[Fraction, dict[int, Fraction]]], n: int) -> None:
    """Refuse weights that no gauge makes symmetric: products around triangles depend on the sense."""

    def around(i: int, j: int, k: int) -> tuple[Fraction, frozenset]:
        edges = [own.get(pair) for pair in ((i, j), (j, k), (k, i))]
        total: dict[int, Fraction] = {}
        number = Fraction(1)
        for edge in edges:
            if edge is None:
                return Fraction(0), frozenset()
            number *= edge[0]
            for name, e in edge[1].items():
                total[name] = total.get(name, Fraction(0)) + e
        return number, frozenset((name, e) for name, e in total.items() if e)

    two_ways = all((j, i) in own for i, j in own)
    if not two_ways or any(around(i, j, k) != around(k, j, i) for i, j, k in itertools.combinations(range(n), 3)):
        raise NotApplicable("fixed points are classified for chains that look the same from both ends")


def _partitions(n: int, odd: bool) -> Iterator[tuple[Phase, ...]]:
    """Yield all choices of disjoint sets of states, each possibly split into two that alternate."""

    def sort(states: Sequence[int]) -> Iterator[list[list[int]]]:
        if not states:
            yield []
            return
        first, rest = states[0], states[1:]
        for groups in sort(rest):
            yield groups
            yield [[first], *groups]
            for k in range(len(groups)):
                yield [*groups[:k], [first, *groups[k]], *groups[k + 1 :]]

    for groups in sort(range(n)):
        ordered = sorted(map(tuple, groups))
        ways = [_splits(group) if odd else [(group,)] for group in ordered]
        if ordered:
            yield from itertools.product(*ways)


def _splits(group: tuple[int, ...]) -> list[Phase]:
    first, rest = group[0], group[1:]
    splits: list[Phase] = [(group,)]
    for size in range(len(rest)):
        for inside in itertools.combinations(rest, size):
            splits.append(((first, *inside), tuple(i for i in rest if i not in inside)))
    return splits


def _pairs(phases: tuple[Phase, ...], n: int) -> np.ndarray:
    """Return where the matrix of these phases has entries."""
    there = np.zeros((n, n), dtype=bool)
    for phase in phases:
        there[np.ix_(phase[0], phase[-1])] = True
        there[np.ix_(phase[-1], phase[0])] = True
    return there


def _vectors(phases: tuple[Phase, ...], space: list[np.ndarray]) -> tuple[np.ndarray, int] | None:
    """Find v with v_i v_j constant on classes and unit length on every set; None if there is none.

    The logarithms of v lie in a linear space, in which Newton's method finds unit lengths.
    """
    n = len(space[0])
    there = _pairs(phases, n)
    if any((there & ~(sum(space) > 0)).ravel()) or any(len({*there[one > 0]}) > 1 for one in space):
        return None
    used = sorted({i for phase in phases for group in phase for i in group})
    equal = [np.zeros(n)]
    for one in space:
        inside = [pair for pair in np.argwhere(one > 0) if there[tuple(pair)]]
        for (i, j), (k, m) in itertools.pairwise(inside):
            row = np.zeros(n)
            for state, sign in ((i, 1), (j, 1), (k, -1), (m, -1)):
                row[state] += sign
            equal.append(row)
    _, lengths, axes = np.linalg.svd(np.array(equal)[:, used])
    basis = axes[int((lengths > 1e-9).sum()) :].T
    sets = [[used.index(i) for i in group] for phase in phases for group in phase]
    found = _unit_lengths(basis, sets)
    if found is None:
        return None
    logs, rank = found
    v = np.zeros(n)
    v[used] = np.exp(logs)
    return v, basis.shape[1] - rank


def _unit_lengths(basis: np.ndarray, sets: list[list[int]]) -> tuple[np.ndarray, int] | None:
    member = np.array([[float(i in group) for i in range(len(basis))] for group in sets])
    at = basis @ (basis.T @ (-0.5 * np.log(member.T @ member.sum(axis=1))))
    for _ in range(200):
        squares = member * np.exp(2 * at)
        short = 1 - squares.sum(axis=1)
        slope = 2 * squares @ basis
        if np.abs(short).max() < _FOUND:
            return at, int(np.linalg.matrix_rank(slope))
        change = basis @ np.linalg.lstsq(slope, short, rcond=None)[0]
        at = at + change * min(1.0, 1.0 / max(float(np.abs(change).max()), 1e-300))
    return None


def _fixed_point(
    step: Recursion, phases: tuple[Phase, ...], v: np.ndarray, freedom: int, space: list[np.ndarray]
) -> FixedPoint:
    weights = np.outer(v, v) * _pairs(phases, len(v))
    powers = [np.linalg.matrix_power(weights, k) for k in range(step.b + 1)]
    assert np.allclose(powers[-1], weights, atol=1e-10)
    linear = np.zeros((len(space), len(space)))
    for column, one in enumerate(space):
        moved = sum(powers[k] @ one @ powers[step.b - 1 - k] for k in range(step.b))
        linear[:, column] = [(moved * other).sum() / other.sum() for other in space]
    grown = sorted(np.linalg.eigvals(linear).real, reverse=True)
    # One of the eigenvalues b is that of the constant.
    grown.remove(min(grown, key=lambda x: abs(x - step.b)))
    rounded = tuple(float(round(x, 9)) + 0.0 for x in grown)
    exponents = tuple(float(np.log(x) / np.log(step.b)) if x > 0 else -np.inf for x in rounded)
    labels = step.table.cuts.labels
    names = tuple(
        tuple(x for k, group in enumerate(phase) for x in (["|"] if k else []) + [labels[i] for i in group])
        for phase in phases
    )
    return FixedPoint(names, weights, freedom, rounded, exponents)
