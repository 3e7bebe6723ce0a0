"""Blume-Capel chain of spin 1.

E = sum_i [ -J s_i s_{i+1} + D s_i^2 - h s_i ],  s = -1, 0, +1

Spin-1 magnets with a single-ion term, and two-species mixtures with vacancies (s = 0): D decides between
filled and empty.
"""

from tmsolve import Chain, bond, site, spins

CHAIN = Chain(
    spins(1),
    [
        bond(lambda s, t, J: -J*s*t),
        site(lambda s, D, h: D*s**2 - h*s),
    ],
    observables={"m": lambda s: s, "q": lambda s: s**2},
    name="Blume-Capel chain",
)

DEFAULTS = {"J": 1, "D": "0.9", "h": 0, "T": "0.4"}

_SOURCE = (
    "M. Blume, Phys. Rev. 141, 517 (1966) and H. W. Capel, Physica 32, 966 (1966) for the model; "
    "chain eigenvalues M. Suzuki, B. Tsujiyama and S. Katsura, J. Math. Phys. 8, 124 (1967); from memory"
)
_DERIVED = "derived from the eigenvalues: " + _SOURCE

FACTS = (
    {
        "id": "free_energy",
        "statement": (
            "f = -T ln l+, l+- = [1 + a +- r]/2, r = sqrt((1-a)^2 + 8 exp(-D/T)), "
            "a = 2 exp(-D/T) cosh(J/T), h = 0"
        ),
        "quantity": "free_energy",
        "point": {"J": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "-0.96334521596866038170478607917775",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "free_energy_without_single_ion_term",
        "statement": "f = -T ln([1 + 2 cosh(J/T) + sqrt((2 cosh(J/T) - 1)^2 + 8)]/2) at D = h = 0",
        "quantity": "free_energy",
        "point": {"J": 1, "D": 0, "h": 0, "T": 1},
        "value": "-1.3350947841124937461936886907354",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "correlation_length_of_the_spin",
        "statement": "xi = 1 / ln(l+/l_odd), l_odd = 2 exp(-D/T) sinh(J/T), h = 0",
        "quantity": "correlation_length(m)",
        "point": {"J": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "1.6426870662822041638898295787684",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "correlation_length_of_the_square",
        "statement": "xi = 1 / ln(l+/l-) for s^2, which does not see the odd eigenvalue, h = 0",
        "quantity": "correlation_length(q)",
        "point": {"J": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "0.42661374877619165818742585149193",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "ring_of_five",
        "statement": "Z_N = l+^N + l-^N + l_odd^N on a ring at h = 0",
        "quantity": "log_Z",
        "cells": 5,
        "boundary": "ring",
        "point": {"J": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "4.8632870046875169285738731553290",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "half_filling",
        "statement": "<s^2> = 1/2 on the line D = T ln(2 cosh(J/T)), h = 0",
        "quantity": "mean(q)",
        "point": {"J": 1, "D": "1.0390907390325649747161203743316", "h": 0, "T": "0.7"},
        "value": "0.5",
        "rtol": 1e-12,
        "source": _DERIVED,
    },
    {
        "id": "mean_square",
        "statement": "<s^2> = [1 + (a-1)/r]/2 at h = 0",
        "quantity": "mean(q)",
        "point": {"J": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "0.68400911397769730467647009916420",
        "rtol": 1e-12,
        "source": _DERIVED,
    },
    {
        "id": "susceptibility",
        "statement": "T chi = <s^2> (l+ + l_odd)/(l+ - l_odd) at h = 0",
        "quantity": "temperature_susceptibility(m)",
        "point": {"J": 1, "D": "0.5", "h": 0, "T": 1},
        "value": "2.3162003682803556722866769102334",
        "rtol": 1e-12,
        "source": _DERIVED,
    },
    {
        "id": "paramagnet",
        "statement": "without coupling m = 2 sinh(h/T) / (1 + 2 cosh(h/T)), the Brillouin function of spin 1",
        "quantity": "mean(m)",
        "point": {"J": 0, "D": 0, "h": 1, "T": 1},
        "value": "0.57521038260444143153099617869025",
        "rtol": 1e-12,
        "source": "L. Brillouin, J. Phys. Radium 8, 74 (1927); from memory",
    },
)
