"""Choosing signs under a few elements of a group that leave a representation in as few times as possible."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from .characters import Constituent
from .groups import PermutationGroup
from .permutations import compose, order_of, power
from .refine import ranked
from .signed import SignedOrbits

__all__ = ["shares", "sign_choices"]

#: Elements of the group that are tried as signs.
_POOL = 32


def sign_choices(
    group: PermutationGroup, parts: Sequence[Constituent], elements: Sequence[np.ndarray]
) -> list[SignedOrbits]:
    """Return, for each constituent, functions in which it occurs as few times, among as few others, as was found.

    Parameters
    ----------
    group : PermutationGroup
        The group.
    parts : sequence of Constituent
        From `constituents`.
    elements : sequence of permutations
        Elements of the group to be tried as signs.

    Examples
    --------
    Two states exchanged: their sum and their difference.

    >>> from tmsolve.symmetry.characters import constituents
    >>> from tmsolve.symmetry.groups import generated
    >>> group = generated([np.array([1, 0])], 2)
    >>> [cut.signs.tolist() for cut in sign_choices(group, constituents(group), [])]
    [[1, 1], [1, -1]]
    """
    pool = _pool(group, elements)
    found: dict[int, tuple[int, int, SignedOrbits]] = {}
    for k, part in enumerate(parts):
        if part.dimension == part.conjugates == 1:
            linear = _linear(group, part)
            found[k] = linear.size, linear.size, linear
    targets = [part.multiplicity * part.conjugates for part in parts]
    pending = [k for k in range(len(parts)) if k not in found]
    for cut in _starts(group, pool) if pending else ():
        for k, share in zip(pending, shares([cut], [parts[k] for k in pending])[0].tolist(), strict=True):
            useful = share and parts[k].dimension % (share // targets[k]) == 0
            if useful and (k not in found or (share, cut.size) < found[k][:2]):
                found[k] = share, cut.size, cut
        pending = [k for k in pending if k not in found or found[k][:2] != (targets[k], targets[k])]
        if not pending:
            break
    for k in pending:
        found[k] = 0, 0, _improved(found[k][2], parts[k], pool, targets[k])
    return [found[k][2] for k in range(len(parts))]


def _pool(group: PermutationGroup, candidates: Sequence[np.ndarray]) -> list[np.ndarray]:
    """Return different elements, those that are their own inverse first."""
    found: dict[bytes, np.ndarray] = {}
    products = [compose(a, b) for a in group.generators for b in group.generators]
    for g in [*candidates, *products][: 4 * _POOL]:
        order = order_of(g)
        for image in (power(g, order // 2), g) if order % 2 == 0 else (g,):
            if order > 1:
                found.setdefault(image.tobytes(), image)
    return sorted(found.values(), key=lambda g: order_of(g) > 2)[:_POOL]


def _starts(group: PermutationGroup, pool: Sequence[np.ndarray]) -> Iterator[SignedOrbits]:
    n = group.degree
    single = SignedOrbits.alone(n)
    yield single
    for x in np.unique(group.orbits, return_index=True)[1]:
        yield SignedOrbits(ranked(group.pair_orbits[x]), np.ones(n, dtype=int))
    for g in pool:
        for sign in (1, -1):
            yield single.joined([(g, sign)])


def shares(cuts: Sequence[SignedOrbits], parts: Sequence[Constituent]) -> np.ndarray:
    """Return the dimension that each constituent has in each space of functions, shape (spaces, constituents)."""
    flat = np.array([part.projector.ravel() for part in parts])
    return np.array([np.rint(flat @ cut.weights().ravel()) for cut in cuts]).astype(int)


def _linear(group: PermutationGroup, part: Constituent) -> SignedOrbits:
    """Return the functions that every element multiplies by its sign."""
    n = group.degree
    single = SignedOrbits.alone(n)
    return single.joined([(g, round(float(part.characters(g)[0].real))) for g in group.generators])


def _improved(cut: SignedOrbits, part: Constituent, pool: Sequence[np.ndarray], target: int) -> SignedOrbits:
    """Ask for further signs as long as that leaves the constituent in, less often or in fewer functions."""
    share = int(shares([cut], [part])[0, 0])
    for g in pool:
        if (share, cut.size) == (target, target):
            break
        for sign in (1, -1):
            smaller = cut.joined([(g, sign)])
            fewer = int(shares([smaller], [part])[0, 0])
            useful = fewer and part.dimension % (fewer // target) == 0
            if useful and (fewer, smaller.size) < (share, cut.size):
                cut, share = smaller, fewer
                break
    return cut
