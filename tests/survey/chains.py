"""Chains that several tests of the room look at."""

from __future__ import annotations

import math

from tmsolve import Chain, bond, colours, ising, site, spins, weight

ISING = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h=0: -h * s)],
    observables={"m": lambda s: s},
    name="Ising",
)
BLUME_CAPEL = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h=0: D * s * s - h * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s},
    name="Blume-Capel",
)
#: The same with a weight of 1, which changes nothing but that there is no T = 0.
WARM = Chain(
    spins(1), [*BLUME_CAPEL.terms, weight(lambda s: 1)], observables=dict(BLUME_CAPEL.observables), name="Blume-Capel"
)
ZIGZAG = Chain(
    ising(),
    [bond(lambda s, t, J1: -J1 * s * t), bond(lambda s, t, J2: -J2 * s * t, shift=2)],
    observables={"m": lambda s: s},
    name="zigzag",
)
#: All sites equal: two classes of states that never mix and tie at mu = 0.
FROZEN = Chain(
    colours(2),
    [bond(lambda s, t: 0 if s == t else math.inf), site(lambda s, mu: -mu * s)],
    observables={"n": lambda s: s},
    name="frozen",
)


def small_blocks(monkeypatch, size):
    """Make scans compute blocks of this many points."""
    monkeypatch.setattr("tmsolve.survey.run._SMALLEST_BLOCK", size)
    monkeypatch.setattr("tmsolve.survey.run._LARGEST_BLOCK", size)
