"""Ising chain with random bonds.

E = sum_i [ -J_i s_i s_{i+1} - h s_i ],  s = -1, +1

Spin glasses in one dimension, and chains with missing bonds. Here J is one number; a law for it makes it random from
bond to bond: choice(-1:0.5,1:0.5), normal(0,1), or choice(0:0.2,1:0.8) for bonds of which a fifth is missing.
"""

from tmsolve import Chain, bond, ising, site

CHAIN = Chain(
    ising(),
    [
        bond(lambda s, t, J: -J*s*t),
        site(lambda s, h: -h*s),
    ],
    observables={"m": lambda s: s},
    name="random-bond Ising chain",
)

DEFAULTS = {"J": 1, "h": 0, "T": 1}

_TEXTBOOK = (
    "for equal bonds: E. Ising, Z. Phys. 31, 253 (1925); R. J. Baxter, Exactly Solved Models in Statistical Mechanics "
    "(1982), chapter 2; from memory"
)

FACTS = (
    {
        "id": "free_energy_of_either_sign",
        "statement": "f = -T ln(2 cosh(J/T)) at h = 0, for either sign of J",
        "quantity": "free_energy",
        "point": {"J": -1, "h": 0, "T": 1},
        "value": "-1.1269280110429724964437268063583",
        "rtol": 1e-13,
        "source": _TEXTBOOK,
    },
    {
        "id": "curie_law",
        "statement": "T chi = exp(2J/T) at h = 0",
        "quantity": "temperature_susceptibility(m)",
        "point": {"J": "-0.7", "h": 0, "T": 1},
        "value": "0.24659696394160647693986123983377",
        "rtol": 1e-12,
        "source": "M. E. Fisher, J. Math. Phys. 4, 124 (1963); from memory",
    },
    {
        "id": "open_chain_of_ten",
        "statement": "Z_N = 2 (2 cosh(J/T))^(N-1) with open ends at h = 0, for either sign of J",
        "quantity": "log_Z",
        "cells": 10,
        "boundary": "open",
        "point": {"J": "-0.8", "h": 0, "T": 1},
        "value": "9.5482538485549947767846890288178",
        "rtol": 1e-13,
        "source": _TEXTBOOK,
    },
    {
        "id": "frustrated_ring_of_seven",
        "statement": "Z_N = (2 cosh(J/T))^N + (2 sinh(J/T))^N on a ring at h = 0",
        "quantity": "log_Z",
        "cells": 7,
        "boundary": "ring",
        "point": {"J": "-0.8", "h": 0, "T": 1},
        "value": "6.828689901725024683123442656063",
        "rtol": 1e-13,
        "source": _TEXTBOOK,
    },
)
