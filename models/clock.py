"""Clock chain of q directions.

E = sum_i [ -J cos(2 pi (n_i - n_{i+1})/q) - h cos(2 pi n_i/q) ],  n = 0 ... q-1

Planar rotors held to q equally spaced directions by a crystal; large q approaches free planar rotors.
"""

from tmsolve import Chain, bond, clock, cos_turns, site


def chain(q: int = 6) -> Chain:
    """Declare the chain of q directions."""
    return Chain(
        clock(q),
        [
            bond(lambda n, k, J: -J*cos_turns(n - k, q)),
            site(lambda n, h: -h*cos_turns(n, q)),
        ],
        observables={"m": lambda n: cos_turns(n, q)},
        name=f"{q}-state clock chain",
    )


DEFAULTS = {"J": 1, "h": 0, "T": "0.5"}

_CIRCULANT = (
    "eigenvalues l_k = sum_n exp((J/T) cos(2 pi n/q)) cos(2 pi n k/q) of a circulant matrix, textbook"
)

FACTS = (
    {
        "id": "free_energy_six_directions",
        "statement": "f = -T ln l_0 at h = 0",
        "quantity": "free_energy",
        "options": {"q": 6},
        "point": {"J": "1.2", "h": 0, "T": 1},
        "value": "-2.1238377818810274441452519094804",
        "rtol": 1e-13,
        "source": _CIRCULANT,
    },
    {
        "id": "correlation_length_six_directions",
        "statement": "xi = 1 / ln(l_0/l_1) at h = 0",
        "quantity": "correlation_length(m)",
        "options": {"q": 6},
        "point": {"J": "1.2", "h": 0, "T": 1},
        "value": "1.4991797996945636062745579259253",
        "rtol": 1e-12,
        "source": _CIRCULANT,
    },
    {
        "id": "ring_of_five_six_directions",
        "statement": "Z_5 = l_0^5 + 2 l_1^5 + 2 l_2^5 + l_3^5 on a ring at h = 0",
        "quantity": "log_Z",
        "cells": 5,
        "boundary": "ring",
        "options": {"q": 6},
        "point": {"J": "1.2", "h": 0, "T": 1},
        "value": "10.688125224663664595061959481281",
        "rtol": 1e-13,
        "source": _CIRCULANT,
    },
    {
        "id": "free_energy_five_directions",
        "statement": "f = -T ln l_0 at h = 0, where the cosines are not rational",
        "quantity": "free_energy",
        "options": {"q": 5},
        "point": {"J": "1.2", "h": 0, "T": 1},
        "value": "-1.9424049970493548214459296545578",
        "rtol": 1e-13,
        "source": _CIRCULANT,
    },
    {
        "id": "four_directions_are_two_ising_chains",
        "statement": "q = 4 is two decoupled Ising chains of coupling J/2: f = -2T ln(2 cosh(J/2T)) at h = 0",
        "quantity": "free_energy",
        "options": {"q": 4},
        "point": {"J": "1.2", "h": 0, "T": 1},
        "value": "-1.7265649346760623783754889248865",
        "rtol": 1e-13,
        "source": "M. Suzuki, Prog. Theor. Phys. 37, 770 (1967); from memory",
    },
    {
        "id": "three_directions_are_potts",
        "statement": "q = 3 is the Potts chain of coupling 3J/2: f = -T ln(exp(3J/2T) + 2) + J/2 at h = 0",
        "quantity": "free_energy",
        "options": {"q": 3},
        "point": {"J": "1.2", "h": 0, "T": 1},
        "value": "-1.4856282972308922272702932316029",
        "rtol": 1e-13,
        "source": "F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982); from memory",
    },
    {
        "id": "two_directions_are_ising",
        "statement": "q = 2 is the Ising chain: m = sinh(h/T) / sqrt(sinh(h/T)^2 + exp(-4J/T))",
        "quantity": "mean(m)",
        "options": {"q": 2},
        "point": {"J": "0.5", "h": "0.3", "T": 1},
        "value": "0.63765264435931049612582982990763",
        "rtol": 1e-12,
        "source": (
            "R. J. Baxter, Exactly Solved Models in Statistical Mechanics (1982), chapter 2; from memory"
        ),
    },
)
