"""Blume-Emery-Griffiths chain of spin 1, with the odd biquadratic term.

E = sum_i [ -J s_i s_{i+1} - K s_i^2 s_{i+1}^2 - K3 (s_i^2 s_{i+1} + s_i s_{i+1}^2) + D s_i^2 - h s_i ],
s = -1, 0, +1

Three-component mixtures and lattice fluids: K attracts filled sites whatever their sign, K3 tells the two
signs apart.
"""

from tmsolve import Chain, bond, site, spins

CHAIN = Chain(
    spins(1),
    [
        bond(lambda s, t, J: -J*s*t),
        bond(lambda s, t, K: -K*s**2*t**2),
        bond(lambda s, t, K3: -K3*(s**2*t + s*t**2)),
        site(lambda s, D, h: D*s**2 - h*s),
    ],
    observables={"m": lambda s: s, "q": lambda s: s**2},
    name="Blume-Emery-Griffiths chain",
)

DEFAULTS = {"J": 1, "K": "0.5", "K3": 0, "D": "1.4", "h": 0, "T": "0.4"}

_SOURCE = (
    "M. Blume, V. J. Emery and R. B. Griffiths, Phys. Rev. A 4, 1071 (1971) for the model; chain eigenvalues "
    "S. Krinsky and D. Furman, Phys. Rev. B 11, 2602 (1975); from memory"
)
_ENUMERATED = "definition: the sum over all 729 configurations, no closed form"

FACTS = (
    {
        "id": "free_energy",
        "statement": (
            "f = -T ln l+, l+- = [1 + a +- sqrt((1-a)^2 + 8 exp(-D/T))]/2, "
            "a = 2 exp(-(D-K)/T) cosh(J/T), K3 = h = 0"
        ),
        "quantity": "free_energy",
        "point": {"J": 1, "K": "0.5", "K3": 0, "D": "0.8", "h": 0, "T": "0.6"},
        "value": "-0.75743902632618679860376474870905",
        "rtol": 1e-13,
        "source": _SOURCE,
    },
    {
        "id": "gap",
        "statement": "the gap is ln(l+/l_odd), l_odd = 2 exp(-(D-K)/T) sinh(J/T), K3 = h = 0",
        "quantity": "gap",
        "point": {"J": 1, "K": "0.5", "K3": 0, "D": "0.8", "h": 0, "T": "0.6"},
        "value": "0.13205757091055137001848934765394",
        "rtol": 1e-12,
        "source": _SOURCE,
    },
    {
        "id": "potts_point",
        "statement": (
            "J = P/2, K = 3P/2, D = 2P is the 3-state Potts chain of coupling P: f = -T ln(exp(P/T) + 2) + P"
        ),
        "quantity": "free_energy",
        "point": {"J": "0.4", "K": "1.2", "K3": 0, "D": "1.6", "h": 0, "T": 1},
        "value": "-0.64114728302636176708998681604615",
        "rtol": 1e-13,
        "source": (
            "spin-1 form of the 3-state Potts model, F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982); from memory"
        ),
    },
    {
        "id": "half_filling",
        "statement": "<s^2> = 1/2 on the line D = K + T ln(2 cosh(J/T)), K3 = h = 0",
        "quantity": "mean(q)",
        "point": {"J": 1, "K": "0.5", "K3": 0, "D": "1.5210314496476778550631175933233", "h": 0, "T": "0.6"},
        "value": "0.5",
        "rtol": 1e-12,
        "source": "derived from the eigenvalues: " + _SOURCE,
    },
    {
        "id": "ring_of_six_in_field",
        "statement": "Z_6 on a ring with a field",
        "quantity": "log_Z",
        "cells": 6,
        "boundary": "ring",
        "point": {"J": 1, "K": "0.5", "K3": 0, "D": "0.8", "h": "0.2", "T": "0.6"},
        "value": "9.1756599928849876446923759710373",
        "rtol": 1e-13,
        "source": _ENUMERATED,
    },
    {
        "id": "ring_of_six_with_odd_term",
        "statement": "Z_6 on a ring with a field and K3",
        "quantity": "log_Z",
        "cells": 6,
        "boundary": "ring",
        "point": {"J": 1, "K": "0.5", "K3": "0.3", "D": "0.8", "h": "0.2", "T": "0.6"},
        "value": "15.01695725875103507724010872064",
        "rtol": 1e-13,
        "source": _ENUMERATED,
    },
)
