"""Ising chain in a random field.

E = sum_i [ -J s_i s_{i+1} - (H + h_i) s_i ],  s = -1, +1

Chains whose sites feel fields of their own, from impurities or a disordered environment: J pulls the spins together,
h_i pulls each its own way, H is uniform. Here h is one number; a law for it makes it random from site to site.
"""

from tmsolve import Chain, bond, ising, site

CHAIN = Chain(
    ising(),
    [
        bond(lambda s, t, J: -J*s*t),
        site(lambda s, H, h: -(H + h)*s),
    ],
    observables={"m": lambda s: s},
    name="random-field Ising chain",
)

DEFAULTS = {"J": 1, "H": 0, "h": 0, "T": 1}

_FIELD = (
    "for equal fields: H. A. Kramers and G. H. Wannier, Phys. Rev. 60, 252 (1941); R. J. Baxter, Exactly Solved Models "
    "in Statistical Mechanics (1982), eq. 2.1.9; from memory"
)

FACTS = (
    {
        "id": "free_energy_in_equal_fields",
        "statement": "f = -T ln[exp(K) cosh L + sqrt(exp(2K) sinh^2 L + exp(-2K))], K = J/T, L = (H + h)/T",
        "quantity": "free_energy",
        "point": {"J": 1, "H": "0.2", "h": "0.1", "T": 1},
        "value": "-1.321052199061438445841148804359",
        "rtol": 1e-13,
        "source": _FIELD,
    },
    {
        "id": "magnetisation_in_equal_fields",
        "statement": "m = sinh L / sqrt(sinh^2 L + exp(-4K)), K = J/T, L = (H + h)/T",
        "quantity": "mean(m)",
        "point": {"J": 1, "H": "0.4", "h": "0.2", "T": 2},
        "value": "0.63765264435931049612582982990763",
        "rtol": 1e-12,
        "source": _FIELD,
    },
    {
        "id": "susceptibility_in_equal_fields",
        "statement": "T chi = cosh L exp(-4K) / (sinh^2 L + exp(-4K))^(3/2), K = J/T, L = (H + h)/T",
        "quantity": "temperature_susceptibility(m)",
        "point": {"J": 1, "H": "0.8", "h": "-0.2", "T": 2},
        "value": "1.29888817847477912358196241832",
        "rtol": 1e-12,
        "source": _FIELD,
    },
    {
        "id": "ring_of_six_in_equal_fields",
        "statement": "Z_N = l+^N + l-^N on a ring",
        "quantity": "log_Z",
        "cells": 6,
        "boundary": "ring",
        "point": {"J": 1, "H": 0, "h": "0.6", "T": 2},
        "value": "5.5263923788618271596671877184606",
        "rtol": 1e-13,
        "source": _FIELD,
    },
)
