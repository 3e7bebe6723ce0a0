"""Helix-coil chain.

weight of a configuration = product over its helical runs of sigma s^k, k the length of the run

Polypeptides and other polymers whose units are in a helix or in a coil: s is the stability of a helical unit
next to another one, sigma << 1 the price of starting a helix. On an open chain a helical first unit starts a
run, which a fixed coil to its left expresses.
"""

from tmsolve import Chain, StateSet, bond, delta, site, weight

COIL, HELIX = "coil", "helix"

CHAIN = Chain(
    StateSet([COIL, HELIX]),
    [
        weight(site(lambda unit, s: s if unit == HELIX else 1)),
        weight(bond(lambda left, unit, sigma: sigma if left == COIL and unit == HELIX else 1)),
    ],
    observables={"helicity": lambda unit: delta(unit, HELIX)},
    name="helix-coil chain",
)

DEFAULTS = {"s": 1, "sigma": "0.0002", "T": 1}

_ZIMM_BRAGG = "B. H. Zimm and J. K. Bragg, J. Chem. Phys. 31, 526 (1959); from memory"
_PBG = "; sigma = 2e-4 as for poly-benzyl-glutamate, B. H. Zimm, P. Doty and K. Iso (1959), from memory"
_LAW = "the helicity is (s/l) dl/ds, l = [1 + s + sqrt((1-s)^2 + 4 sigma s)]/2"

FACTS = (
    {
        "id": "open_chain_of_twelve",
        "statement": "Z_N = [l1^(N+1) (1-l2) - l2^(N+1) (1-l1)]/(l1-l2) for N units after a fixed coil",
        "quantity": "log_Z",
        "cells": 13,
        "boundary": "open",
        "left": COIL,
        "point": {"s": "1.1", "sigma": "0.01", "T": 1},
        "value": "0.87355326816059238406034068543831",
        "rtol": 1e-12,
        "source": _ZIMM_BRAGG,
    },
    {
        "id": "helicity_below_the_midpoint",
        "statement": _LAW,
        "quantity": "mean(helicity)",
        "point": {"s": "0.95", "sigma": "0.0002", "T": 1},
        "value": "0.062144097434963262792778845281102",
        "rtol": 1e-12,
        "source": _ZIMM_BRAGG + _PBG,
    },
    {
        "id": "helicity_at_the_midpoint",
        "statement": "the helicity is 1/2 at s = 1, whatever sigma",
        "quantity": "mean(helicity)",
        "point": {"s": 1, "sigma": "0.0002", "T": 1},
        "value": "0.5",
        "rtol": 1e-12,
        "source": _ZIMM_BRAGG + _PBG,
    },
    {
        "id": "helicity_above_the_midpoint",
        "statement": _LAW,
        "quantity": "mean(helicity)",
        "point": {"s": "1.05", "sigma": "0.0002", "T": 1},
        "value": "0.93258033762873921449270000493656",
        "rtol": 1e-12,
        "source": _ZIMM_BRAGG + _PBG,
    },
    {
        "id": "helicity_far_above_the_midpoint",
        "statement": _LAW,
        "quantity": "mean(helicity)",
        "point": {"s": "1.1", "sigma": "0.0002", "T": 1},
        "value": "0.97935311802960652313110084981097",
        "rtol": 1e-12,
        "source": _ZIMM_BRAGG + _PBG,
    },
    {
        "id": "sharpness_at_the_midpoint",
        "statement": "the slope of the helicity against s at s = 1 is 1/(4 sqrt sigma)",
        "quantity": "mean(helicity)",
        "derivative": ("s",),
        "point": {"s": 1, "sigma": "0.0002", "T": 1},
        "value": "17.677669529663688110021109052621",
        "rtol": 1e-10,
        "source": _ZIMM_BRAGG,
    },
    {
        "id": "correlation_length_at_the_midpoint",
        "statement": "xi = 1 / ln((1 + sqrt sigma)/(1 - sqrt sigma)) at s = 1",
        "quantity": "correlation_length(helicity)",
        "point": {"s": 1, "sigma": "0.0002", "T": 1},
        "value": "35.352981911002377746271969824235",
        "rtol": 1e-11,
        "source": "derived from the eigenvalues 1 +- sqrt sigma: " + _ZIMM_BRAGG,
    },
)
