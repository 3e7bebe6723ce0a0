"""How fast the average over disorder of connected correlations decays.

A connected correlation is carried along the message x from the left by the matrices A of `memory`. On the average
it is carried by one operator on functions g of the message,

    (D g)(x) = E[Aᵀ g(x′) | x],

whose largest eigenvalue that correlations see gives the decay. It is projected onto polynomials of the message that are
orthogonal for sampled messages (M. O. Williams, I. G. Kevrekidis and C. W. Rowley, J. Nonlinear Sci. 25, 1307 (2015);
from memory). Unlike in an average of sampled correlations rare chains do not rule, and signs of A do no harm.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations_with_replacement
from math import comb

import numpy as np

from ..errors import NotApplicable
from .averages import Average, average
from .message import Message, advance, start
from .problem import Problem
from .steps import StepMaker, Steps
from .strata import node_count
from .walk import node_steps, random_steps

__all__ = ["averaged_decay"]

#: Most polynomials, and their highest degree.
_MOST, _DEGREE = 40, 18
#: Groups of replicas that the bar comes from.
_GROUPS = 16
#: Combinations of polynomials that vary by less than this share of the largest are rounding.
_SINGULAR = 1e-10
#: Eigenvalues that differ by less than this share belong together; what correlations see of them must stand clear of
#: its standard error by this factor, and be more than this share of the most that is seen.
_ALIKE, _CLEAR, _ABSENT = 0.01, 3.0, 1e-9
#: A factor of decay that is nothing.
_NOTHING = 1e-12


@dataclass(frozen=True, eq=False)
class _Sums:
    """Sums over samples, the last axis being that of groups of replicas.

    Attributes
    ----------
    weight : ndarray, shape (groups,)
    products : ndarray, shape (polynomials, polynomials, groups)
    moved : ndarray, shape (polynomials, rest, polynomials, rest, groups)
        ⟨φⱼ(x) E[A_ba φₖ(x′)]⟩ at (j, a, k, b).
    local : ndarray, shape (polynomials, rest, states, groups)
        ⟨φⱼ w⟩ for the response w of a local mean to the message.
    """

    weight: np.ndarray
    products: np.ndarray
    moved: np.ndarray
    local: np.ndarray

    def __add__(self, other: _Sums) -> _Sums:
        names = ("weight", "products", "moved", "local")
        return _Sums(*(getattr(self, name) + getattr(other, name) for name in names))

    def without(self, group: int | None) -> tuple[np.ndarray, np.ndarray]:
        """Return averages of products and of what has moved over all groups but one."""
        kept = [i for i in range(len(self.weight)) if i != group]
        total = float(self.weight[kept].sum())
        return self.products[..., kept].sum(axis=-1) / total, self.moved[..., kept].sum(axis=-1) / total


def averaged_decay(problem: Problem, cells: int, replicas: int, burn_in: int, seed: int) -> Average:
    """Return the correlation length of the average of connected correlations, in cells.

    The error is the bar of a jackknife over groups of replicas and what the last two degrees of polynomials changed.
    """
    maker = StepMaker(problem)
    if maker.states == 1:
        return Average(0.0, 0.0)
    sums, degrees = _summed(maker, cells, replicas, burn_in, np.random.default_rng([seed, 4]))
    # Where an eigenfunction is even or odd every other degree changes nothing.
    most, *fewer = (int((degrees <= max(degrees.max() - less, 0)).sum()) for less in (0, 1, 2))
    groups = len(sums.weight)
    value = _seen(sums, most)
    whole = abs(value)
    if whole <= _NOTHING:
        return Average(0.0, 0.0)
    _check(whole)
    parts = np.array([_nearest(_projected(sums, group, most)[0], value) for group in range(groups)])
    rates = groups * -np.log(whole) + (groups - 1) * np.log(np.maximum(parts, _NOTHING))
    bar = average(rates)
    rate = -np.log(whole)
    coarse = np.array([_nearest(_projected(sums, None, few)[0], value) for few in fewer])
    doubt = float(np.abs(np.log(whole / np.maximum(coarse, _NOTHING))).max())
    return Average(float(1 / rate), float((bar.error + doubt) / rate**2), bar.degrees)


def _check(factor: float) -> None:
    if factor >= 1:
        raise NotApplicable(
            f"the average of correlations seems not to decay (a factor of {factor:.6g} per cell in this sample); "
            "take more cells or replicas"
        )


def _summed(
    maker: StepMaker, cells: int, replicas: int, burn_in: int, rng: np.random.Generator
) -> tuple[_Sums, np.ndarray]:
    message = start(maker.states, 0, 0, replicas)
    for step in random_steps(maker, rng, burn_in, replicas):
        message, _ = advance(message, step)
    power = _power(message)
    held = int(np.isfinite(message.log).sum(axis=1).argmax())
    if not np.isfinite(message.log[held]).all():
        raise NotApplicable(
            "no state is allowed at every cut; the decay of average correlations needs one that differences refer to"
        )
    owner = np.arange(replicas) * min(_GROUPS, replicas) // replicas
    total: _Sums | None = None
    for step, ahead, weights in _ahead(maker, rng, cells, replicas):
        found = _one(message, ahead, weights, power, held, owner)
        total = found if total is None else total + found
        message, _ = advance(message, step)
    assert total is not None
    return total, _monomials(message, power)[1]


def _ahead(
    maker: StepMaker, rng: np.random.Generator, cells: int, replicas: int
) -> Iterator[tuple[Steps, Steps, np.ndarray]]:
    """Yield the step that is taken, and all possible ones with their chances; where they are too many, that one."""
    steps = random_steps(maker, rng, cells, replicas)
    if not node_count(maker.problem):
        yield from ((step, step, np.ones((1, replicas))) for step in steps)
        return
    for step, (ahead, weights) in zip(steps, node_steps(maker, rng, cells, replicas), strict=True):
        yield step, ahead, weights


def _one(
    message: Message, ahead: Steps, weights: np.ndarray, power: float, held: int, owner: np.ndarray
) -> _Sums:
    """Return the sums of one cell."""
    count, replicas = weights.shape
    states = len(message.log)
    others = [s for s in range(states) if s != held]
    wide = message.spread(count)
    after, growth = advance(wide, ahead)
    joint = wide.log[:, None] + ahead.log
    with np.errstate(invalid="ignore"):
        before = np.exp(joint - (after.log + growth.value))
    before = np.where(np.isfinite(after.log), before, before[:, held, None])
    apart = (before[others][:, others] - before[others][:, [held]]).reshape(states - 1, states - 1, count, replicas)
    here, there = _monomials(message, power)[0], _monomials(after, power)[0].reshape(-1, count, replicas)
    # Axes: a before, b behind, k polynomial, q node, r replica.
    carried = np.einsum("abqr,kqr,qr->akbr", apart, there, weights, optimize=True)
    chance = message.chance
    response = chance[others][:, None] * (np.eye(states)[others][:, :, None] - chance)
    groups = owner.max() + 1
    member = np.equal.outer(owner, np.arange(groups)).astype(np.float64)
    return _Sums(
        member.sum(axis=0),
        np.einsum("jr,kr,rg->jkg", here, here, member, optimize=True),
        np.einsum("jr,akbr,rg->jakbg", here, carried, member, optimize=True),
        np.einsum("jr,bsr,rg->jbsg", here, response, member, optimize=True),
    )


def _power(message: Message) -> float:
    """Return the power of probabilities at which polynomials of a message vary over the whole range."""
    finite = np.isfinite(message.log)
    held = np.where(finite, message.log, 0.0)
    spread = np.sqrt(2 * held.var(axis=1, where=finite | ~finite.any(axis=1, keepdims=True)).max())
    return 1.5 / max(1.5, float(spread))


def _monomials(message: Message, power: float) -> tuple[np.ndarray, np.ndarray]:
    """Return all monomials of the message up to some degree, 1 included, and their degrees."""
    chance = np.exp(power * (message.log - message.log.max(axis=0)))
    chance /= chance.sum(axis=0)
    contrast = 2 * chance[:-1] - 1 if len(chance) > 2 else chance[:1] - chance[1:]
    degree = max(d for d in range(1, _DEGREE + 1) if d == 1 or comb(len(contrast) + d, d) <= _MOST)
    chosen = [c for d in range(degree + 1) for c in combinations_with_replacement(range(len(contrast)), d)]
    values = np.stack([np.prod(contrast[list(c)], axis=0) if c else np.ones(contrast.shape[1]) for c in chosen])
    return values, np.array([len(c) for c in chosen])


def _projected(sums: _Sums, left_out: int | None, polynomials: int) -> tuple[np.ndarray, np.ndarray]:
    """Return the operator on the first polynomials, made orthonormal, and how they are made of the monomials."""
    products, moved = sums.without(left_out)
    some = slice(polynomials)
    size, turn = np.linalg.eigh(products[some, some])
    kept = size > _SINGULAR * size.max()
    basis = turn[:, kept] / np.sqrt(size[kept])
    matrix = np.einsum("jm,jakb,kn->manb", basis, moved[some, :, some], basis, optimize=True)
    wide = matrix.shape[0] * matrix.shape[1]
    return matrix.reshape(wide, wide).astype(np.complex128), basis


def _seen(sums: _Sums, polynomials: int) -> complex:
    """Return the largest eigenvalue that correlations see; 0 where they see none.

    Raises
    ------
    NotApplicable
        What they see of a larger one may be noise.
    """
    matrix, basis = _projected(sums, None, polynomials)
    values, modes = np.linalg.eig(matrix)
    rest, groups = sums.local.shape[1], len(sums.weight)
    # The law of the message in every group of replicas, and the response of a local mean, which is a function of it.
    laws = np.einsum("jm,jg,ab->gamb", basis, sums.products[:polynomials, 0] / sums.weight, np.eye(rest))
    ends = np.einsum("jm,jbs->mbs", basis, sums.local[:polynomials].sum(axis=-1) / sums.weight.sum())
    laws, ends = laws.reshape(groups, rest, -1) @ modes, np.linalg.solve(modes, ends.reshape(len(modes), -1))
    order = np.argsort(-np.abs(values), kind="stable")
    found = []
    while len(order):
        near = np.abs(values[order] - values[order[0]]) <= _ALIKE * np.abs(values[order[0]])
        some, order = order[near], order[~near]
        shares = laws[:, :, some] @ ends[some]
        size = float(np.linalg.norm(shares.mean(axis=0)))
        noise = float(np.linalg.norm(shares.std(axis=0, ddof=1))) / np.sqrt(groups)
        found.append((complex(values[some[0]]), size, noise))
    largest = max(size * abs(value) for value, size, _ in found)
    for value, size, noise in found:
        if abs(value) > _NOTHING and size * abs(value) > _ABSENT * largest:
            if size < _CLEAR * noise:
                raise NotApplicable(
                    f"whether correlations that decay by {abs(value):.3g} per cell survive the average over disorder "
                    "cannot be told from this sample; take more cells and replicas"
                )
            return value
    return 0j


def _nearest(matrix: np.ndarray, value: complex) -> float:
    """Return the modulus of the eigenvalue nearest to a value."""
    values = np.linalg.eigvals(matrix)
    return float(np.abs(values[np.abs(values - value).argmin()]))
