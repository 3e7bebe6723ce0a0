"""Ising chain with nearest and next-nearest neighbours.

E = sum_i [ -J1 s_i s_{i+1} - J2 s_i s_{i+2} - h s_i ],  s = -1, +1

The simplest competition of ranges: with J2 < 0 order turns from uniform or alternating to pairs, through
modulated decay; chain compounds with two exchange paths.
"""

from tmsolve import Chain, bond, ising, site

CHAIN = Chain(
    ising(),
    [
        bond(lambda s, t, J1: -J1*s*t),
        bond(lambda s, t, J2: -J2*s*t, shift=2),
        site(lambda s, h: -h*s),
    ],
    observables={"m": lambda s: s},
    name="next-nearest-neighbour Ising chain",
)

DEFAULTS = {"J1": 1, "J2": "-0.25", "h": 0, "T": "0.8"}

_STEPHENSON = "J. Stephenson, Can. J. Phys. 48, 1724 (1970) and Phys. Rev. B 1, 4405 (1970); from memory"

FACTS = (
    {
        "id": "free_energy",
        "statement": (
            "f = -T ln l, l = exp(K2) cosh K1 + sqrt(exp(2 K2) sinh^2 K1 + exp(-2 K2)), Ki = Ji/T, h = 0"
        ),
        "quantity": "free_energy",
        "point": {"J1": 1, "J2": "-0.4", "h": 0, "T": "0.7"},
        "value": "-0.84336094909975818723008476234325",
        "rtol": 1e-13,
        "source": _STEPHENSON,
    },
    {
        "id": "gap_beyond_the_disorder_point",
        "statement": (
            "the gap is ln(l/|l_odd|), |l_odd|^2 = exp(-2 K2) - exp(2 K2) where the odd pair is complex, "
            "h = 0"
        ),
        "quantity": "gap",
        "point": {"J1": 1, "J2": "-0.4", "h": 0, "T": "0.7"},
        "value": "0.68699915476848783901567811373743",
        "rtol": 1e-12,
        "source": _STEPHENSON,
    },
    {
        "id": "wave_number",
        "statement": (
            "cos k = exp(K2) sinh K1 / sqrt(exp(-2 K2) - exp(2 K2)) beyond the disorder point, h = 0"
        ),
        "quantity": "wave_number(m)",
        "point": {"J1": 1, "J2": "-0.25", "h": 0, "T": "1.5"},
        "value": "0.74266621684379364571002061934757",
        "rtol": 1e-11,
        "source": _STEPHENSON,
    },
    {
        "id": "correlation_length",
        "statement": "xi = 1 / ln(l/|l_odd|) beyond the disorder point, h = 0",
        "quantity": "correlation_length(m)",
        "point": {"J1": 1, "J2": "-0.25", "h": 0, "T": "1.5"},
        "value": "0.94666361071120469421147448376056",
        "rtol": 1e-12,
        "source": _STEPHENSON,
    },
    {
        "id": "open_chain_of_nine",
        "statement": (
            "Z is twice that of an open chain of the 8 bond variables, with coupling J2 in a field J1, h = 0"
        ),
        "quantity": "log_Z",
        "cells": 9,
        "boundary": "open",
        "point": {"J1": 1, "J2": "-0.4", "h": 0, "T": "0.7"},
        "value": "10.537300592738806743062314126783",
        "rtol": 1e-13,
        "source": _STEPHENSON,
    },
    {
        "id": "ring_of_eight_in_field",
        "statement": "Z_8 on a ring with a field",
        "quantity": "log_Z",
        "cells": 8,
        "boundary": "ring",
        "point": {"J1": 1, "J2": "-0.4", "h": "0.3", "T": "0.7"},
        "value": "10.946892695722770994376452344808",
        "rtol": 1e-13,
        "source": "definition: the sum over all 256 configurations, no closed form",
    },
    {
        "id": "without_second_neighbours",
        "statement": "J2 = 0 is the Ising chain: m = sinh(h/T) / sqrt(sinh(h/T)^2 + exp(-4 J1/T))",
        "quantity": "mean(m)",
        "point": {"J1": "0.5", "J2": 0, "h": "0.3", "T": 1},
        "value": "0.63765264435931049612582982990763",
        "rtol": 1e-12,
        "source": (
            "R. J. Baxter, Exactly Solved Models in Statistical Mechanics (1982), chapter 2; from memory"
        ),
    },
    {
        "id": "without_first_neighbours",
        "statement": "J1 = 0 is two interleaved Ising chains: xi = -2 / ln tanh(J2/T) in cells, h = 0",
        "quantity": "correlation_length(m)",
        "point": {"J1": 0, "J2": 1, "h": 0, "T": 1},
        "value": "7.3437218650219021510131564350718",
        "rtol": 1e-12,
        "source": "Baxter (1982), eqs 2.2.13-2.2.17, for each of the two chains; from memory",
    },
)
