"""Group D: H = -J1 sum s_i s_{i+1} - J2 sum s_i s_{i+2} - h sum s_i with s = +-1.

Left out of this group: D07 and D08 (residual entropies), D11 and D12 (counts of configurations).
"""

from __future__ import annotations

import math

from tests.facts.near import eigenvalues, near, only
from tmsolve import Chain, bond, crossovers, ising, open_chain, site, solve

ZIGZAG = Chain(
    ising(),
    [
        bond(lambda s, t, J1: -J1 * s * t),
        bond(lambda s, t, J2: -J2 * s * t, shift=2),
        site(lambda s, h: -h * s),
    ],
    observables={"m": lambda s: s},
)


def test_four_eigenvalues():
    """D01: J1 = 1, J2 = -0.4, T = 0.7; one pair is complex. Stephenson, Can. J. Phys. 48, 1724 (1970)."""
    found = eigenvalues(solve(ZIGZAG.at(T="0.7", J1=1, J2="-0.4", h=0)), 4)
    real, imaginary = "1.1105415795735239677", "1.2583741916791660758"
    near(found[0].real, "3.336096316248334941")
    assert abs(found[0].imag) <= 1e-12
    pair = sorted(found[1:3], key=lambda value: value.imag)
    for value, sign in zip(pair, "-+", strict=True):
        near(value.real, real)
        near(value.imag, imaginary if sign == "+" else "-" + imaginary)
    near(found[3].real, "-0.84434259062806162189")
    assert abs(found[3].imag) <= 1e-12


def test_open_chain_of_nine():
    """D02: Z by bond variables, N = 9, J1 = 1, J2 = -0.4, T = 0.7. Stephenson, Phys. Rev.

    B 1, 4405 (1970).
    """
    point = ZIGZAG.at(T="0.7", J1=1, J2="-0.4", h=0)
    near(math.exp(open_chain(point, 9).log_Z), "37695.67301604383222853675")


def test_disorder_point():
    """D03: cosh(J1/T_D) = exp(2|J2|/T_D), J2 = -0.25. Stephenson, Can. J. Phys. 48, 1724 (1970)."""
    events = crossovers(ZIGZAG.fix(J1=1, J2="-0.25", h=0), along="T", between=(0.2, 3))
    point = only(events, "disorder point")
    near(point.location, "0.82050896496424416101")
    assert point.error <= 1e-10 * point.location


def test_modulated_correlations():
    """D05: wave number and length, J1 = 1, J2 = -0.25, T = 1.5. Stephenson, Can. J. Phys. 48, 1724 (1970)."""
    solution = solve(ZIGZAG.at(T="1.5", J1=1, J2="-0.25", h=0))
    near(solution.wave_number("m"), "0.74266621684379364571")
    near(solution.correlation_length("m"), "0.94666361071120469421")
