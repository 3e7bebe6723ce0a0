"""Potts chain of q colours.

E = sum_i [ -J delta(s_i, s_{i+1}) - h delta(s_i, 0) ],  s = 0 ... q-1

Cooperative order among q equivalent states, one of which a field can favour; J < 0 gives colouring problems.
With a name instead of a number for q, closed forms hold for every number of colours.
"""

from tmsolve import Chain, bond, colours, delta, site


def chain(q: int | str = 3) -> Chain:
    """Declare the chain of q colours."""
    return Chain(
        colours(q, special=(0,)),
        [
            bond(lambda s, t, J: -J*delta(s, t)),
            site(lambda s, h: -h*delta(s, 0)),
        ],
        observables={"m": lambda s: delta(s, 0)},
        name=f"{q}-state Potts chain",
    )


DEFAULTS = {"J": 1, "h": 0, "T": "0.5"}

_WU = "F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982); from memory"
_PEAK = (
    "the two-level formula with q-1 degenerate upper states, derived from Wu (1982); height as in "
    "E. S. R. Gopal, Specific Heats at Low Temperatures (1966), from memory"
)

FACTS = (
    {
        "id": "ring_of_five",
        "statement": "Z_N = (exp(J/T) + q - 1)^N + (q - 1)(exp(J/T) - 1)^N on a ring at h = 0",
        "quantity": "log_Z",
        "cells": 5,
        "boundary": "ring",
        "options": {"q": 3},
        "point": {"J": 1, "h": 0, "T": 1},
        "value": "7.7699531901633920645538691006263",
        "rtol": 1e-13,
        "source": _WU,
    },
    {
        "id": "ring_of_five_antiferromagnetic",
        "statement": "the same with J < 0, where exp(J/T) - 1 is negative",
        "quantity": "log_Z",
        "cells": 5,
        "boundary": "ring",
        "options": {"q": 4},
        "point": {"J": "-0.7", "h": 0, "T": 1},
        "value": "6.2587487271153211878252283686371",
        "rtol": 1e-13,
        "source": _WU,
    },
    {
        "id": "free_energy_ten_colours",
        "statement": "f = -T ln(exp(J/T) + q - 1) at h = 0",
        "quantity": "free_energy",
        "options": {"q": 10},
        "point": {"J": 2, "h": 0, "T": 1},
        "value": "-2.7966138010382244341011630086899",
        "rtol": 1e-13,
        "source": _WU,
    },
    {
        "id": "correlation_length",
        "statement": "xi = 1 / ln((exp(J/T) + q - 1)/(exp(J/T) - 1)) at h = 0",
        "quantity": "correlation_length(m)",
        "options": {"q": 3},
        "point": {"J": 1, "h": 0, "T": 1},
        "value": "0.98998152622605179898179816899104",
        "rtol": 1e-12,
        "source": _WU,
    },
    {
        "id": "colours_equally_likely",
        "statement": "every colour has probability 1/q at h = 0",
        "quantity": "mean(m)",
        "options": {"q": 3},
        "point": {"J": 1, "h": 0, "T": 1},
        "value": "0.33333333333333333333333333333333",
        "rtol": 1e-13,
        "source": "symmetry under permutation of the colours",
    },
    {
        "id": "free_energy_in_field",
        "statement": (
            "l+ = [e^K (e^L + 1) + q - 2 + sqrt((e^(K+L) - e^K - q + 2)^2 + 4 (q-1) e^L)] / 2, K = J/T, "
            "L = h/T; f = -T ln l+"
        ),
        "quantity": "free_energy",
        "options": {"q": 3},
        "point": {"J": "0.7", "h": "0.4", "T": 1},
        "value": "-1.5552542052864996831852466651569",
        "rtol": 1e-13,
        "source": "Z. Glumac and K. Uzelac, J. Phys. A 27, 7709 (1994); from memory",
    },
    {
        "id": "gap_in_field",
        "statement": "the gap is ln(l+/l-), l- with the other sign of the root; l- > exp(K) - 1",
        "quantity": "gap",
        "options": {"q": 3},
        "point": {"J": "0.7", "h": "0.4", "T": 1},
        "value": "1.3071227724111679152328763140572",
        "rtol": 1e-12,
        "source": "Z. Glumac and K. Uzelac, J. Phys. A 27, 7709 (1994); from memory",
    },
    {
        "id": "two_colours_are_ising",
        "statement": (
            "q = 2 is the Ising chain of coupling J/2 with -J/2 per bond: f = -T ln(2 cosh(J/2T)) - J/2"
        ),
        "quantity": "free_energy",
        "options": {"q": 2},
        "point": {"J": "0.9", "h": 0, "T": 1},
        "value": "-1.2411538747320878232261588166228",
        "rtol": 1e-13,
        "source": _WU,
    },
    {
        "id": "specific_heat_maximum_three_colours",
        "statement": "the maximum of c = K^2 (q-1) e^K / (e^K + q - 1)^2, K = J/T, at h = 0",
        "quantity": "specific_heat",
        "options": {"q": 3},
        "point": {"J": 1, "h": 0, "T": "0.37669636178115649687998556211544"},
        "value": "0.76180223768980018758840410610715",
        "rtol": 1e-12,
        "source": _PEAK,
    },
    {
        "id": "specific_heat_maximum_four_colours",
        "statement": "the same for q = 4",
        "quantity": "specific_heat",
        "options": {"q": 4},
        "point": {"J": 1, "h": 0, "T": "0.35149521207154468358717606521916"},
        "value": "1.0234905543865051400408102613764",
        "rtol": 1e-12,
        "source": _PEAK,
    },
)
