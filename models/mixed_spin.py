"""Chain of alternating spins 1/2 and 1.

E = sum_i [ -J (s_i S_i + S_i s_{i+1}) + D S_i^2 - h (s_i + S_i) ],  s = -1/2, +1/2,  S = -1, 0, +1

Ferrimagnetic chains of two kinds of ion; the spin-1 ion carries the single-ion term.
"""

from tmsolve import Chain, bond, site, spins

CHAIN = Chain(
    {"s": spins("1/2"), "S": spins(1)},
    [
        bond(lambda s, S, J: -J*s*S, ("s", "S"), shift=0),
        bond(lambda S, s, J: -J*S*s, ("S", "s"), shift=1),
        site(lambda S, D: D*S**2, "S"),
        site(lambda s, h: -h*s),
    ],
    observables={
        "m": lambda s: s,
        "m_s": site(lambda s: s, "s"),
        "m_S": site(lambda S: S, "S"),
        "q": site(lambda S: S**2, "S"),
    },
    name="mixed spin-1/2 and spin-1 chain",
)

DEFAULTS = {"J": -1, "D": 0, "h": 0, "T": "0.4"}

_SOURCE = "M. E. Fisher, Phys. Rev. 113, 969 (1959), summing the spins 1 between the spins 1/2; from memory"

FACTS = (
    {
        "id": "free_energy",
        "statement": "f = -T ln(A + B), A = 1 + 2 exp(-D/T) cosh(J/T), B = 1 + 2 exp(-D/T), h = 0",
        "quantity": "free_energy",
        "point": {"J": "1.3", "D": "0.4", "h": 0, "T": 1},
        "value": "-1.7889098675137413749292555368247",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "correlation_length",
        "statement": "xi = 1 / ln((A + B)/(A - B)) in cells, h = 0",
        "quantity": "correlation_length(m_s)",
        "point": {"J": "1.3", "D": "0.4", "h": 0, "T": 1},
        "value": "0.65561740113410105642676290088562",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "ring_of_four",
        "statement": "Z_N = (A + B)^N + (A - B)^N on a ring of N cells, h = 0",
        "quantity": "log_Z",
        "cells": 4,
        "boundary": "ring",
        "point": {"J": "1.3", "D": "0.4", "h": 0, "T": 1},
        "value": "7.1578773228055528812230411739432",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "mean_square_of_spin_1",
        "statement": "<S^2> = (A + B - 2)/(A + B), h = 0",
        "quantity": "mean(q)",
        "point": {"J": "1.3", "D": "0.4", "h": 0, "T": 1},
        "value": "0.66571544477046736247756494986678",
        "rtol": 1e-12,
        "source": "derived: the derivative of the free energy by D; " + _SOURCE,
    },
)
