"""Spin-1 chain with a single-ion term and next-nearest neighbours.

E = sum_i [ -J1 s_i s_{i+1} - J2 s_i s_{i+2} + D s_i^2 - h s_i ],  s = -1, 0, +1

Spin-1 chain magnets with competing ranges, where vacancies (s = 0) relieve the frustration.
"""

from tmsolve import Chain, bond, site, spins

CHAIN = Chain(
    spins(1),
    [
        bond(lambda s, t, J1: -J1*s*t),
        bond(lambda s, t, J2: -J2*s*t, shift=2),
        site(lambda s, D, h: D*s**2 - h*s),
    ],
    observables={"m": lambda s: s, "q": lambda s: s**2},
    name="next-nearest-neighbour spin-1 chain",
)

DEFAULTS = {"J1": 1, "J2": "-0.4", "D": "0.6", "h": 0, "T": "0.4"}

_BLUME_CAPEL = (
    "M. Blume, Phys. Rev. 141, 517 (1966) and H. W. Capel, Physica 32, 966 (1966) for the model; "
    "chain eigenvalues M. Suzuki, B. Tsujiyama and S. Katsura, J. Math. Phys. 8, 124 (1967); from memory"
)

FACTS = (
    {
        "id": "without_second_neighbours",
        "statement": "J2 = 0 is the Blume-Capel chain: T chi = <s^2> (l+ + l_odd)/(l+ - l_odd) at h = 0",
        "quantity": "temperature_susceptibility(m)",
        "point": {"J1": 1, "J2": 0, "D": "0.5", "h": 0, "T": 1},
        "value": "2.3162003682803556722866769102334",
        "rtol": 1e-12,
        "source": "derived from the eigenvalues: " + _BLUME_CAPEL,
    },
    {
        "id": "without_first_neighbours",
        "statement": (
            "J1 = 0 is two interleaved Blume-Capel chains: f = -T ln l+, "
            "l+ = [1 + a + sqrt((1-a)^2 + 8 exp(-D/T))]/2, a = 2 exp(-D/T) cosh(J2/T), h = 0"
        ),
        "quantity": "free_energy",
        "point": {"J1": 0, "J2": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "-0.96334521596866038170478607917775",
        "rtol": 1e-13,
        "source": _BLUME_CAPEL,
    },
    {
        "id": "correlation_length_without_first_neighbours",
        "statement": "J1 = 0: xi = 2 / ln(l+/l_odd) in cells, l_odd = 2 exp(-D/T) sinh(J2/T), h = 0",
        "quantity": "correlation_length(m)",
        "point": {"J1": 0, "J2": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "3.285374132564408327779659157537",
        "rtol": 1e-12,
        "source": _BLUME_CAPEL,
    },
    {
        "id": "ring_of_six_in_field",
        "statement": "Z_6 on a ring with both couplings and a field",
        "quantity": "log_Z",
        "cells": 6,
        "boundary": "ring",
        "point": {"J1": "0.8", "J2": "-0.3", "D": "0.4", "h": "0.2", "T": "0.9"},
        "value": "5.7808652056355992049444993762283",
        "rtol": 1e-13,
        "source": "definition: the sum over all 729 configurations, no closed form",
    },
)
