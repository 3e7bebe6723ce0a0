"""Diluted Blume-Capel chain of spin 1.

E = sum_i [ -J s_i s_{i+1} + D s_i^2 - h s_i ],  s = -1, 0, +1,  and a factor c_i per site with s != 0

Magnetic chains of which some sites are empty: c = 1 on a site that carries a spin, c = 0 on an empty one, which
then has the one state 0. A law such as choice(0:0.1,1:0.9) for c empties a tenth of the sites; values between are a
fugacity.
"""

from tmsolve import Chain, bond, site, spins, weight

CHAIN = Chain(
    spins(1),
    [
        bond(lambda s, t, J: -J*s*t),
        site(lambda s, D, h: D*s**2 - h*s),
        weight(lambda s, c: c if s else 1),
    ],
    observables={"m": lambda s: s, "q": lambda s: s**2},
    name="diluted Blume-Capel chain",
)

DEFAULTS = {"J": 1, "D": "0.5", "h": 0, "c": 1, "T": 1}

_SOURCE = (
    "for equal c: M. Blume, Phys. Rev. 141, 517 (1966) and H. W. Capel, Physica 32, 966 (1966); chain eigenvalues "
    "M. Suzuki, B. Tsujiyama and S. Katsura, J. Math. Phys. 8, 124 (1967), with D - T ln c in the place of D; "
    "from memory"
)

FACTS = (
    {
        "id": "free_energy_without_empty_sites",
        "statement": (
            "f = -T ln l+, l+- = [1 + a +- r]/2, r = sqrt((1-a)^2 + 8 exp(-D/T)), a = 2 exp(-D/T) cosh(J/T), h = 0, "
            "c = 1"
        ),
        "quantity": "free_energy",
        "point": {"J": 1, "D": "0.5", "h": 0, "c": 1, "T": 1},
        "value": "-0.96334521596866038170478607917775",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "free_energy_at_a_fugacity",
        "statement": "the same with c exp(-D/T) in the place of exp(-D/T)",
        "quantity": "free_energy",
        "point": {"J": 1, "D": "0.5", "h": 0, "c": "0.25", "T": 1},
        "value": "-0.29681202182823633304428322967927",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "mean_square_without_empty_sites",
        "statement": "<s^2> = [1 + (a-1)/r]/2 at h = 0, c = 1",
        "quantity": "mean(q)",
        "point": {"J": 1, "D": "0.5", "h": 0, "c": 1, "T": 1},
        "value": "0.68400911397769730467647009916420",
        "rtol": 1e-12,
        "source": "derived from the eigenvalues: " + _SOURCE,
    },
    {
        "id": "ring_of_five",
        "statement": "Z_N = l+^N + l-^N + l_odd^N on a ring at h = 0, c = 1",
        "quantity": "log_Z",
        "cells": 5,
        "boundary": "ring",
        "point": {"J": 1, "D": "0.5", "h": 0, "c": 1, "T": 1},
        "value": "4.8632870046875169285738731553290",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "empty_chain",
        "statement": "a chain of empty sites has one configuration of energy 0: f = 0",
        "quantity": "free_energy",
        "point": {"J": 1, "D": "0.5", "h": 0, "c": 0, "T": 1},
        "value": "0",
        "rtol": 1e-12,
        "atol": 1e-15,
        "source": "the definition",
    },
)
