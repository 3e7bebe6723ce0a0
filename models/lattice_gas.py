"""Lattice gas with nearest-neighbour exclusion.

E = sum_i [ -mu n_i ],  n = 0, 1,  n_i n_{i+1} = 0

Adsorption on a line where a particle blocks its neighbours; ligands that cover two sites; independent sets of
a path.
"""

from math import inf

from tmsolve import Chain, bond, occupation, site

CHAIN = Chain(
    occupation(),
    [
        bond(lambda n, k: inf if n == k == 1 else 0),
        site(lambda n, mu: -mu*n),
    ],
    observables={"density": lambda n: n},
    name="lattice gas with nearest-neighbour exclusion",
)

DEFAULTS = {"mu": 0, "T": 1}

_SOURCE = "textbook: the largest root of l^2 = l + z, z = exp(mu/T); from memory"

FACTS = (
    {
        "id": "golden_ratio",
        "statement": "f = -T ln((1 + sqrt 5)/2) at mu = 0",
        "quantity": "free_energy",
        "point": {"mu": 0, "T": 1},
        "value": "-0.48121182505960344749775891342437",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "density_of_ligands_on_two_sites",
        "statement": "the density x solves x = z (1 - 2x)^2/(1 - x); x = (1 - 1/sqrt 5)/2 at z = 1",
        "quantity": "mean(density)",
        "point": {"mu": 0, "T": 1},
        "value": "0.27639320225002103035908263312687",
        "rtol": 1e-12,
        "source": (
            "J. D. McGhee and P. H. von Hippel, J. Mol. Biol. 86, 469 (1974), eq. 10 with n = 2; from memory"
        ),
    },
    {
        "id": "density",
        "statement": "the density is (1 - 1/sqrt(1 + 4z))/2, z = exp(mu/T)",
        "quantity": "mean(density)",
        "point": {"mu": "0.6", "T": "0.5"},
        "value": "0.36768813567983591094202509670840",
        "rtol": 1e-12,
        "source": "derived: the derivative of the free energy by mu; " + _SOURCE,
    },
    {
        "id": "correlation_length",
        "statement": "xi = 1 / ln((r + 1)/(r - 1)), r = sqrt(1 + 4z)",
        "quantity": "correlation_length(density)",
        "point": {"mu": "0.6", "T": "0.5"},
        "value": "1.8445161184830975847930941982669",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "wave_number",
        "statement": "the second eigenvalue is negative: particles alternate, k = pi",
        "quantity": "wave_number(density)",
        "point": {"mu": "0.6", "T": "0.5"},
        "value": "3.1415926535897932384626433832795",
        "rtol": 1e-14,
        "source": _SOURCE,
    },
    {
        "id": "configurations_of_an_open_line",
        "statement": "N = 10 sites have F_12 = 144 allowed configurations (Fibonacci numbers)",
        "quantity": "log_Z",
        "cells": 10,
        "boundary": "open",
        "point": {"mu": 0, "T": 1},
        "value": "4.9698132995760006204594189596778",
        "rtol": 1e-13,
        "source": "OEIS A000045; from memory",
    },
    {
        "id": "configurations_of_a_ring",
        "statement": "N = 10 sites on a ring have L_10 = 123 allowed configurations (Lucas numbers)",
        "quantity": "log_Z",
        "cells": 10,
        "boundary": "ring",
        "point": {"mu": 0, "T": 1},
        "value": "4.8121843553724174952620086099599",
        "rtol": 1e-13,
        "source": (
            "Castorene, Pena and Vargas, arXiv:2511.01646 (abstract looked up), for the ground states of the "
            "Ising antiferromagnet at h = 2|J|, where no two spins against the field are neighbours"
        ),
    },
)
