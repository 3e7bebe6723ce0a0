"""A zoo of small chains, one per feature of a declaration, on which the laws are checked.

Every energy uses + - * / only, so that the references can evaluate the same functions with many digits.
All parameter values are exact decimals.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import NamedTuple

from tmsolve import Chain, StateSet, bond, colours, delta, ising, occupation, site, spins, term, weight


class Animal(NamedTuple):
    """A chain of the zoo with one point of its parameter space."""

    name: str
    chain: Chain
    values: Mapping[str, str]


def spin(s):
    """Return the spin itself, the most common observable."""
    return s


def square(s):
    """Return the square of a spin."""
    return s * s


def _exchange(s, t, J):
    return -J * s * t


def _field(s, h):
    return -h * s


M = {"m": spin}
MQ = {"m": spin, "q": square}


def _ising() -> Chain:
    far = bond(lambda s, t: s * t, shift=3)
    return Chain(ising(), [bond(_exchange), site(_field)], observables={"m": spin, "far": far})


def _potts() -> Chain:
    return Chain(
        colours(3),
        [bond(lambda s, t, J: -J * delta(s, t)), site(lambda s, h: -h * delta(s, 0))],
        observables={"m": lambda s: 1 if s == 0 else 0},
    )


def _blume_capel() -> Chain:
    return Chain(spins(1), [bond(_exchange), site(lambda s, D, h: D * s * s - h * s)], observables=MQ)


def _nnn_ising() -> Chain:
    return Chain(
        ising(),
        [bond(lambda s, t, J1: -J1 * s * t), bond(lambda s, t, J2: -J2 * s * t, shift=2), site(_field)],
        observables=M,
    )


def _nnn_spin1() -> Chain:
    return Chain(
        spins(1),
        [
            bond(lambda s, t, J1: -J1 * s * t),
            bond(lambda s, t, J2: -J2 * s * t, shift=2),
            site(lambda s, D, h: D * s * s - h * s),
        ],
        observables=MQ,
    )


def _mixed() -> Chain:
    return Chain(
        {"s": spins("1/2"), "S": spins(1)},
        [
            bond(_exchange, ("s", "S"), shift=0),
            bond(_exchange, ("S", "s"), shift=1),
            site(lambda S, D: D * S * S, "S"),
            site(_field),
        ],
        observables={"m": spin, "n": site(spin, "s"), "q": site(square, "S")},
    )


def _diamond() -> Chain:
    return Chain(
        {"n": spins("1/2"), "a": spins("1/2"), "b": spins("1/2")},
        [
            term(lambda n, a, b, J1: -J1 * n * (a + b), ("n", 0), ("a", 0), ("b", 0)),
            term(lambda a, b, n, J1: -J1 * n * (a + b), ("a", 0), ("b", 0), ("n", 1)),
            bond(lambda a, b, J2: -J2 * a * b, ("a", "b"), shift=0),
            site(_field),
        ],
        observables={"m": spin, "n": site(spin, "n"), "d": bond(lambda a, b: a * b, ("a", "b"), shift=0)},
    )


def _sawtooth() -> Chain:
    return Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "a"), shift=1),
            bond(lambda s, t, K: -K * s * t, ("a", "b"), shift=0),
            bond(lambda s, t, K: -K * s * t, ("b", "a"), shift=1),
            site(_field),
        ],
        observables={"m": spin, "n": site(spin, "a")},
    )


def _ladder() -> Chain:
    return Chain(
        {"a": ising(), "b": ising()},
        [
            bond(_exchange, ("a", "a"), shift=1),
            bond(_exchange, ("b", "b"), shift=1),
            bond(lambda s, t, R: -R * s * t, ("a", "b"), shift=0),
            site(_field),
        ],
        observables={"m": spin, "rung": bond(lambda s, t: s * t, ("a", "b"), shift=0)},
    )


def _three_site() -> Chain:
    return Chain(
        ising(),
        [
            term(lambda s, t, u, K3: -K3 * s * t * u, ("s", 0), ("s", 1), ("s", 2)),
            bond(_exchange),
            site(_field),
        ],
        observables={"m": spin, "e": bond(lambda s, t: s * t)},
    )


def _lattice_gas() -> Chain:
    return Chain(
        occupation(),
        [bond(lambda n, p: math.inf if n == 1 and p == 1 else 0), site(lambda n, mu: -mu * n)],
        observables={"n": spin},
    )


def _helix_coil() -> Chain:
    return Chain(
        StateSet(("c", "h")),
        [
            weight(lambda a, s: s if a == "h" else 1, ("s", 0)),
            weight(lambda a, b, sigma: sigma if a == "c" and b == "h" else 1, ("s", 0), ("s", 1)),
        ],
        observables={"helix": lambda a: 1 if a == "h" else 0},
    )


def _weighted() -> Chain:
    return Chain(StateSet((1, 0, -1), weights=(1, 3, 4)), [bond(_exchange), site(_field)], observables=MQ)


def _thermal() -> Chain:
    return Chain(
        ising(), [bond(lambda s, t, J, a, T: -(J - a * T / (1 + T)) * s * t), site(_field)], observables=M
    )


def _no_bonds() -> Chain:
    return Chain(spins("3/2"), [site(lambda s, D, h: D * s * s - h * s)], observables=MQ)


def _shift_two_only() -> Chain:
    return Chain(ising(), [bond(lambda s, t, J2: -J2 * s * t, shift=2), site(_field)], observables=M)


def _strings() -> Chain:
    energies = {("red", "red"): -1, ("red", "blue"): 1, ("blue", "green"): -1, ("green", "green"): 0}
    return Chain(
        StateSet(("red", "green", "blue")),
        [
            bond(lambda a, b, J: J * energies.get((a, b), 0)),
            site(lambda a, h: -h if a == "green" else 0),
        ],
        observables={"m": lambda a: 1 if a == "green" else 0},
    )


def _alternating() -> Chain:
    return Chain(
        spins(1),
        [
            bond(lambda s, t: math.inf if (s == 0) == (t == 0) else 0),
            bond(lambda s, t, J2: -J2 * s * t, shift=2),
            site(lambda s, D, h: D * s * s - h * s),
        ],
        observables=MQ,
    )


def _animal(name: str, chain: Chain, **values: str) -> Animal:
    return Animal(name, chain, values)


ZOO = (
    _animal("ising", _ising(), T="1.3", J="1", h="0.3"),
    _animal("potts", _potts(), T="0.9", J="1", h="0.2"),
    _animal("blume_capel", _blume_capel(), T="0.8", J="1", D="0.7", h="0.15"),
    _animal("nnn_ising", _nnn_ising(), T="1.1", J1="1", J2="-0.4", h="0.25"),
    _animal("nnn_spin1", _nnn_spin1(), T="1.2", J1="1", J2="-0.3", D="0.4", h="0.1"),
    _animal("mixed", _mixed(), T="0.7", J="1", D="0.3", h="0.2"),
    _animal("diamond", _diamond(), T="0.6", J1="-1", J2="-0.8", h="0.35"),
    _animal("sawtooth", _sawtooth(), T="1.4", J="-1", K="-0.9", h="0.5"),
    _animal("ladder", _ladder(), T="1.5", J="1", R="-0.6", h="0.2"),
    _animal("three_site", _three_site(), T="1.6", K3="0.7", J="1", h="-0.2"),
    _animal("lattice_gas", _lattice_gas(), T="0.8", mu="1"),
    _animal("helix_coil", _helix_coil(), T="1", s="1.1", sigma="0.05"),
    _animal("weighted", _weighted(), T="1.2", J="1", h="0.4"),
    _animal("thermal", _thermal(), T="0.9", J="1", a="0.5", h="0.2"),
    _animal("no_bonds", _no_bonds(), T="0.8", D="1", h="0.3"),
    _animal("shift_two_only", _shift_two_only(), T="1.3", J2="1", h="0.2"),
    _animal("strings", _strings(), T="0.7", J="1", h="0.3"),
    _animal("alternating", _alternating(), T="1.1", J2="1", D="0.4", h="0.3"),
)
NAMES = tuple(animal.name for animal in ZOO)
BY_NAME = {animal.name: animal for animal in ZOO}
