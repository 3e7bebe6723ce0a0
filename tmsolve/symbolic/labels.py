"""Naming blocks by how their states behave under symmetries that have a name.

A part is named by a symmetry only where that acts on all its states in the same way: as a sign,
as a phase and its opposite, or as one representation of the permutations of equivalent states.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Sequence
from fractions import Fraction

import numpy as np

from ..symmetry.characters import Constituent
from ..symmetry.permutations import compose, power
from .permutations import Permutation

__all__ = ["SYMMETRIC", "block_labels"]

SYMMETRIC = "symmetric: equal on equivalent states"
_NEAR = 1e-6
#: Most equivalent states whose representations are looked up by name.
_SHAPES = 24


def block_labels(parts: Sequence[Constituent], named: Sequence[Permutation]) -> list[str]:
    """Return a different text for every constituent of a permutation representation, the trivial one first."""
    labels: list[str] = []
    for part in parts:
        texts = [*_parities(part, named), *_rotations(part, named), *_shapes(part, named)]
        labels.append(", ".join(texts) or (SYMMETRIC if not labels else ""))
    for k, (part, label) in enumerate(zip(parts, labels, strict=True)):
        if not label or labels.count(label) > 1:
            alike = [i for i, other in enumerate(labels) if other == label]
            kind = f"representation {alike.index(k) + 1} of {len(alike)} of this kind, dimension {part.dimension}"
            labels[k] = f"{label}, {kind}" if label else f"differences of equivalent states, {kind}"
    return labels


def _value(part: Constituent, images: Sequence[np.ndarray]) -> np.ndarray | None:
    """Return what the mean of some permutations multiplies each complex part by; ``None`` if not by a number."""
    values = np.mean([part.characters(image) for image in images], axis=0)
    moved = np.mean([part.projectors[:, :, image] for image in images], axis=0)
    same = np.abs(moved - values[:, None, None] * part.projectors).max() < _NEAR
    return values if same else None


def _parities(part: Constituent, named: Sequence[Permutation]) -> list[str]:
    odd: list[str] = []
    even: list[str] = []
    for label, image in _signs(named):
        value = _value(part, [image])
        if value is not None and np.abs(value.imag).max() < _NEAR:
            (odd if value[0].real < 0 else even).append(label)
    return [f"{word} under {' and '.join(which)}" for word, which in (("odd", odd), ("even", even)) if which]


def _signs(named: Sequence[Permutation]) -> Iterator[tuple[str, np.ndarray]]:
    """Yield the permutations whose sign is of interest: not those that only belong to a larger family."""
    kinds = {p.move[0] for p in named}
    families = set(_families(named))
    turned = {p.move[1] for p in named if p.move[0] == "rotation"}
    met: set[bytes] = set()
    for p in named:
        kind = p.move[0]
        covered = (
            (kind == "legs" and "leg rotation" in kinds)
            or (kind in ("reversal", "exchange") and p.move[1] in families | turned)
            or (kind == "reflection" and (p.move[1] in families or p.move[1] not in turned))
            or (kind == "combined" and bool(kinds & {"reversal", "legs"}))
        )
        if kind not in ("rotation", "leg rotation") and not covered and p.image.tobytes() not in met:
            met.add(p.image.tobytes())
            yield p.label, p.image


def _rotations(part: Constituent, named: Sequence[Permutation]) -> list[str]:
    texts = []
    for p in named:
        if p.move[0] == "leg rotation":
            turns = _turns(part, p.image, p.move[1])
            texts += [f"momentum {_listed(map(_angle, turns))} round the legs"] if turns else []
        if p.move[0] == "rotation" and p.move[1] not in _families(named):
            order = p.move[2]
            turns = _turns(part, p.image, order)
            charges = [("±" if 0 < t < Fraction(1, 2) else "") + str(t * order) for t in turns]
            texts += [f"Z{order} charge {_listed(charges)} of the states{p.move[1]}"] if turns else []
    return texts


def _listed(texts: Iterable[str]) -> str:
    *first, last = texts
    return f"{', '.join(first)} and {last}" if first else last


def _turns(part: Constituent, image: np.ndarray, order: int) -> list[Fraction]:
    """Return the different angles, in turns from 0 to 1/2, that a rotation or its inverse stands for."""
    value = _value(part, [image, power(image, -1)])
    if value is None:
        return []
    turns = [round(math.acos(max(-1.0, min(1.0, float(v.real)))) / (2 * math.pi) * order) for v in value]
    if any(abs(math.cos(2 * math.pi * t / order) - v.real) > _NEAR for t, v in zip(turns, value, strict=True)):
        return []
    return [Fraction(t, order) for t in sorted(set(turns))]


def _angle(turn: Fraction) -> str:
    angle = 2 * turn
    if angle in (0, 1):
        return "π" if angle else "0"
    front = "" if angle.numerator == 1 else str(angle.numerator)
    return f"±{front}π/{angle.denominator}"


def _families(named: Sequence[Permutation]) -> dict[str, list[list[int]]]:
    """Return, for the sites of each name, the sets of three or more states that may be exchanged at will."""
    found: dict[str, list[list[int]]] = {}
    for name in dict.fromkeys(p.move[1] for p in named if p.move[0] == "exchange"):
        sets: list[set[int]] = []
        for p in named:
            if p.move[:2] == ("exchange", name):
                pair = set(p.move[2:])
                touching = [s for s in sets if s & pair]
                sets = [s for s in sets if not s & pair] + [pair.union(*touching)]
        large = [sorted(s) for s in sets if len(s) > 2]
        if large:
            found[name] = large
    return found


def _shapes(part: Constituent, named: Sequence[Permutation]) -> list[str]:
    texts = []
    for name, families in _families(named).items():
        for states in families:
            swaps = [p for p in named if p.move[:2] == ("exchange", name) and set(p.move[2:]) <= set(states)]
            text = _shape(part, swaps, len(states))
            if text:
                everything = _all_states(named, name) == len(states)
                which = f"{len(states)} states" if everything else "states " + ", ".join(map(str, states))
                texts.append(f"{text} permutations of the {which}{name}")
    return texts


def _all_states(named: Sequence[Permutation], name: str) -> int:
    return next((p.move[2] for p in named if p.move[0] == "rotation" and p.move[1] == name), 0)


def _shape(part: Constituent, swaps: Sequence[Permutation], k: int) -> str:
    """Name the Young diagram from the sums of the contents of its boxes and of their squares.

    These are eigenvalues of the sum of all exchanges, and of that of all three-cycles with the number of pairs
    added (elements of Jucys and Murphy, from memory).
    """
    pairs = k * (k - 1) // 2
    complete = len(swaps) == pairs
    exchange = _value(part, [p.image for p in swaps]) if complete else part.characters(swaps[0].image)
    touching = next(p for p in swaps[1:] if len({*p.move[2:], *swaps[0].move[2:]}) == 3)
    cycle = part.characters(compose(swaps[0].image, touching.image))
    if exchange is None or k > _SHAPES:
        return ""
    first, second = pairs * exchange[0].real, pairs * (k - 2) / 1.5 * cycle[0].real + pairs
    fitting = [
        shape
        for shape in _partitions(k, k)
        if abs(_contents(shape, 1) - first) < _NEAR * k**3 and abs(_contents(shape, 2) - second) < _NEAR * k**3
    ]
    if len(fitting) != 1:
        return ""
    names = {(k,): "symmetric under", (1,) * k: "antisymmetric under", (k - 1, 1): "standard representation of the"}
    return names.get(fitting[0], f"representation {list(fitting[0])} of the")


def _contents(shape: Sequence[int], exponent: int) -> int:
    return sum((column - row) ** exponent for row, length in enumerate(shape) for column in range(length))


def _partitions(total: int, largest: int) -> Iterator[tuple[int, ...]]:
    if total == 0:
        yield ()
    for first in range(min(total, largest), 0, -1):
        for rest in _partitions(total - first, first):
            yield (first, *rest)
