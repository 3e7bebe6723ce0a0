"""Two-leg Ising ladder.

E = sum_i [ -J (a_i a_{i+1} + b_i b_{i+1}) - R a_i b_i - h (a_i + b_i) ],  a, b = -1, +1

Pairs of coupled chains: spin ladders, double strands; the rungs R bind the two legs J.
"""

from tmsolve import Chain, bond, ising, site

CHAIN = Chain(
    {"a": ising(), "b": ising()},
    [
        *(bond(lambda s, t, J: -J*s*t, (leg, leg), shift=1) for leg in "ab"),
        bond(lambda a, b, R: -R*a*b, ("a", "b"), shift=0),
        site(lambda s, h: -h*s),
    ],
    observables={
        "m": lambda s: s,
        "rung": bond(lambda a, b: a*b, ("a", "b"), shift=0),
    },
    name="two-leg Ising ladder",
)

DEFAULTS = {"J": 1, "R": "0.5", "h": 0, "T": 1}

_SOURCE = (
    "textbook: the even and odd sectors under exchange of the legs and reversal of the spins; from memory"
)

FACTS = (
    {
        "id": "free_energy",
        "statement": "f = -T ln l+, l+- = 2 [cosh R cosh 2J +- sqrt(sinh^2 R cosh^2 2J + 1)] at T = 1, h = 0",
        "quantity": "free_energy",
        "point": {"J": "0.4", "R": "0.7", "h": 0, "T": 1},
        "value": "-1.8255973024488464180700245774095",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "gap",
        "statement": "the gap is ln(l+/l2), l2 = 2 exp(R) sinh 2J at T = 1, R > 0, h = 0",
        "quantity": "gap",
        "point": {"J": "0.4", "R": "0.7", "h": 0, "T": 1},
        "value": "0.55111431569004414279996807785463",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "ring_of_four",
        "statement": (
            "Z_N = l+^N + l-^N + (2 exp(R) sinh 2J)^N + (2 exp(-R) sinh 2J)^N on a ring at T = 1, h = 0"
        ),
        "quantity": "log_Z",
        "cells": 4,
        "boundary": "ring",
        "point": {"J": "0.4", "R": "0.7", "h": 0, "T": 1},
        "value": "7.4074366359763461790568970914549",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "rung_correlation",
        "statement": "<a b> = d ln l+ / dR at T = 1, h = 0",
        "quantity": "mean(rung)",
        "point": {"J": "0.4", "R": "0.7", "h": 0, "T": 1},
        "value": "0.71219745151880596068009505891440",
        "rtol": 1e-12,
        "source": "derived: the derivative of the free energy by R; " + _SOURCE,
    },
)
