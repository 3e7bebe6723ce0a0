"""Diamond chain of spins 1/2: nodes n joined through dimers a, b.

E = sum_i [ -J1 n_i (a_i + b_i) - J1 (a_i + b_i) n_{i+1} - J2 a_i b_i - h (n_i + a_i + b_i) ],
n, a, b = -1/2, +1/2

Frustrated copper chains in caricature: with J1, J2 < 0 the dimer competes with the nodes, and the crossover
can be extremely sharp.
"""

from tmsolve import Chain, bond, site, spins

CHAIN = Chain(
    {"n": spins("1/2"), "a": spins("1/2"), "b": spins("1/2")},
    [
        *(bond(lambda s, n, J1: -J1*s*n, (spin, "n"), shift=shift) for spin in "ab" for shift in (0, 1)),
        bond(lambda a, b, J2: -J2*a*b, ("a", "b"), shift=0),
        site(lambda s, h: -h*s),
    ],
    observables={
        "m": lambda s: s,
        "m_node": site(lambda n: n, "n"),
        "m_dimer": [site(lambda a: a, "a"), site(lambda b: b, "b")],
    },
    name="diamond chain",
)

DEFAULTS = {"J1": -1, "J2": "-1.9", "h": 1, "T": "0.08"}

_SOURCE = "M. E. Fisher, Phys. Rev. 113, 969 (1959), summing the dimer between two nodes; from memory"
_PSEUDO = (
    "J. Strecka, Acta Phys. Pol. A 137, 610 (2020), arXiv:1904.10704, for the model and the mechanism "
    "(abstract looked up); the parameter values are our own"
)

FACTS = (
    {
        "id": "free_energy",
        "statement": (
            "f = -T ln(V1 + V0), V1 = 2 exp(J2/4T) cosh(J1/T) + 2 exp(-J2/4T), "
            "V0 = 2 exp(J2/4T) + 2 exp(-J2/4T), h = 0"
        ),
        "quantity": "free_energy",
        "point": {"J1": 1, "J2": "-0.6", "h": 0, "T": "0.4"},
        "value": "-1.0995196379786266251641243222105",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "correlation_length",
        "statement": "xi = 1 / ln((V1 + V0)/(V1 - V0)) in cells, h = 0",
        "quantity": "correlation_length(m_node)",
        "point": {"J1": 1, "J2": "-0.6", "h": 0, "T": "0.4"},
        "value": "1.2577033347764711365534737251235",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "ring_of_three",
        "statement": "Z_N = (V1 + V0)^N + (V1 - V0)^N on a ring of N cells, h = 0",
        "quantity": "log_Z",
        "cells": 3,
        "boundary": "ring",
        "point": {"J1": 1, "J2": "-0.6", "h": 0, "T": "0.4"},
        "value": "8.3344643325506235214441421640499",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "node_turns_over",
        "statement": (
            "the nodal magnetisation changes sign where the weights of two up and of two down nodes are equal"
        ),
        "quantity": "mean(m_node)",
        "point": {"J1": -1, "J2": "-1.9", "h": 1, "T": "0.0721346527989286817961540293206098703"},
        "value": "0",
        "rtol": 0.0,
        "atol": 1e-10,
        "source": _PSEUDO,
    },
    {
        "id": "correlation_length_at_the_turn",
        "statement": "xi = 1 / ln((V1 + V0)/(V1 - V0)) in cells where the two weights V1 are equal",
        "quantity": "correlation_length",
        "point": {"J1": -1, "J2": "-1.9", "h": 1, "T": "0.0721346527989286817961540293206098703"},
        "value": "256.00248206461106561568774213693",
        "rtol": 1e-10,
        "source": _PSEUDO,
    },
)
