"""Ising chain.

E = sum_i [ -J s_i s_{i+1} - h s_i ],  s = -1, +1

The reference model of cooperative order in one dimension: uniaxial magnets with chain structure, two-state
polymers.
"""

from tmsolve import Chain, bond, ising, site

CHAIN = Chain(
    ising(),
    [
        bond(lambda s, t, J: -J*s*t),
        site(lambda s, h: -h*s),
    ],
    observables={"m": lambda s: s},
    name="Ising chain",
)

DEFAULTS = {"J": 1, "h": 0, "T": "0.8"}

_TEXTBOOK = (
    "E. Ising, Z. Phys. 31, 253 (1925); R. J. Baxter, Exactly Solved Models in Statistical Mechanics (1982), "
    "chapter 2; from memory"
)
_FIELD = "H. A. Kramers and G. H. Wannier, Phys. Rev. 60, 252 (1941); Baxter (1982), eq. 2.1.9; from memory"

FACTS = (
    {
        "id": "free_energy_without_field",
        "statement": "f = -T ln(2 cosh(J/T)) at h = 0",
        "quantity": "free_energy",
        "point": {"J": 1, "h": 0, "T": 1},
        "value": "-1.1269280110429724964437268063583",
        "rtol": 1e-13,
        "source": _TEXTBOOK,
    },
    {
        "id": "magnetisation_in_field",
        "statement": "m = sinh(h/T) / sqrt(sinh(h/T)^2 + exp(-4J/T))",
        "quantity": "mean(m)",
        "point": {"J": 1, "h": "0.6", "T": 2},
        "value": "0.63765264435931049612582982990763",
        "rtol": 1e-12,
        "source": _TEXTBOOK,
    },
    {
        "id": "susceptibility_in_field",
        "statement": "T chi = cosh(h/T) exp(-4J/T) / (sinh(h/T)^2 + exp(-4J/T))^(3/2)",
        "quantity": "temperature_susceptibility(m)",
        "point": {"J": 1, "h": "0.6", "T": 2},
        "value": "1.29888817847477912358196241832",
        "rtol": 1e-12,
        "source": _TEXTBOOK,
    },
    {
        "id": "antiferromagnetic_curie_law",
        "statement": "T chi = exp(2J/T) at h = 0, for either sign of J",
        "quantity": "temperature_susceptibility(m)",
        "point": {"J": "-0.7", "h": 0, "T": 1},
        "value": "0.24659696394160647693986123983377",
        "rtol": 1e-12,
        "source": "M. E. Fisher, J. Math. Phys. 4, 124 (1963); from memory",
    },
    {
        "id": "correlation_length_without_field",
        "statement": "xi = -1 / ln tanh(J/T) at h = 0",
        "quantity": "correlation_length",
        "point": {"J": 1, "h": 0, "T": 1},
        "value": "3.6718609325109510755065782175359",
        "rtol": 1e-12,
        "source": "Baxter (1982), eqs 2.2.13-2.2.17; from memory",
    },
    {
        "id": "correlation_length_in_field",
        "statement": (
            "xi = 1 / ln(l+/l-), l+- = exp(K) cosh L +- sqrt(exp(2K) sinh^2 L + exp(-2K)), K = J/T, L = h/T"
        ),
        "quantity": "correlation_length(m)",
        "point": {"J": 1, "h": "0.6", "T": 2},
        "value": "1.0135303299187796349959192179161",
        "rtol": 1e-12,
        "source": "Baxter (1982), eqs 2.2.13-2.2.17; from memory",
    },
    {
        "id": "specific_heat_maximum",
        "statement": "the maximum of c at h = 0 is K*^2 - 1 at T = J/K*, where K* tanh K* = 1",
        "quantity": "specific_heat",
        "point": {"J": 1, "h": 0, "T": "0.83355655960096469843616147022422"},
        "value": "0.43922883989064515077597963665485",
        "rtol": 1e-12,
        "source": "K* is OEIS A085984 (digits looked up); c = (K/cosh K)^2 from the free energy above",
    },
    {
        "id": "ring_of_seven",
        "statement": "Z_N = (2 cosh(J/T))^N + (2 sinh(J/T))^N on a ring at h = 0",
        "quantity": "log_Z",
        "cells": 7,
        "boundary": "ring",
        "point": {"J": "0.8", "h": 0, "T": 1},
        "value": "6.9426741266662279324867841248623",
        "rtol": 1e-13,
        "source": _TEXTBOOK,
    },
    {
        "id": "ring_of_six_in_field",
        "statement": "Z_N = l+^N + l-^N on a ring",
        "quantity": "log_Z",
        "cells": 6,
        "boundary": "ring",
        "point": {"J": 1, "h": "0.6", "T": 2},
        "value": "5.5263923788618271596669877184606",
        "rtol": 1e-13,
        "source": _FIELD,
    },
    {
        "id": "open_chain_of_ten",
        "statement": "Z_N = 2 (2 cosh(J/T))^(N-1) with open ends at h = 0",
        "quantity": "log_Z",
        "cells": 10,
        "boundary": "open",
        "point": {"J": "0.8", "h": 0, "T": 1},
        "value": "9.5482538485549947767846890288178",
        "rtol": 1e-13,
        "source": _TEXTBOOK,
    },
)
