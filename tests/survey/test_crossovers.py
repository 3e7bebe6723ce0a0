"""Located crossovers against numbers from outside, each without being told where."""

import math

import numpy as np
import pytest

from tests.facts.near import near, only
from tests.survey.chains import BLUME_CAPEL, ISING, ZIGZAG
from tmsolve import Chain, StateSet, bond, clock, colours, crossovers, delta, ising, site, solve


def potts(q):
    return Chain(colours(q), [bond(lambda s, t, J: -J * delta(s, t))], {"p": lambda s: delta(s, 0)})


def test_specific_heat_peak_of_the_ising_chain():
    """A08: K tanh K = 1 (OEIS A085984, A033259): T = 0.8335565596…, c = 0.4392288398…."""
    peak = only(crossovers(ISING.fix(J=1), "T", (0.05, 10)), "maximum of specific_heat")
    near(peak.location, "0.833556559600964698436161470224", "1e-14")
    near(peak.height, "0.439228839890645150775979636655", "1e-13")
    assert peak.error < 1e-14


def test_susceptibility_peak_of_the_antiferromagnetic_chain():
    """A18: chi = exp(-2|J|/T)/T is largest at T = 2|J|, 1/(2e). Fisher, J. Math. Phys. 4, 124 (1963), from memory."""
    peak = only(crossovers(ISING.fix(J=-1), "T", (0.1, 10)), "maximum of susceptibility(m)")
    near(peak.location, "2", "1e-14")
    near(peak.height, "0.1839397205857211608", "1e-13")


@pytest.mark.parametrize(
    ("q", "K", "height"),
    [(3, "2.6546579724625921667", "0.76180223768980018759"), (4, "2.8449889661554085824", "1.02349055438650514")],
)
def test_specific_heat_peak_of_the_potts_chain(q, K, height):
    """B04: derived from Wu, Rev. Mod. Phys. 54, 235 (1982)."""
    peak = only(crossovers(potts(q).fix(J=1), "T", (0.05, 10)), "maximum of specific_heat")
    near(1 / peak.location, K, "1e-13")
    near(peak.height, height, "1e-12")


@pytest.mark.parametrize("T", ["0.1", "0.3", "0.7", "1.5", "4"])
def test_half_way_line_of_the_blume_capel_chain(T):
    """C04: <S^2> = 1/2 at D = T ln(2 cosh(J/T)); derived from the closed form of the three eigenvalues."""
    point = only(crossovers(BLUME_CAPEL.fix(J=1, T=T), "D", (0, 8)), "half-way of q")
    exact = float(T) * (1 / float(T) + math.log1p(math.exp(-2 / float(T))))
    assert point.location == pytest.approx(exact, rel=1e-14) and point.height == pytest.approx(0.5, abs=1e-13)
    assert abs(point.location - exact) <= 2 * point.error


def test_specific_heat_peak_beside_the_transition_at_zero_temperature():
    """C13: the Blume-Capel chain at D = 0.9 J; own number of the collection, from the closed form."""
    peak = only(crossovers(BLUME_CAPEL.fix(J=1, D="0.9"), "T", (0.05, 10)), "maximum of specific_heat")
    near(peak.location, "0.2538613899", "1e-9")
    near(peak.height, "0.9379948944", "1e-9")


@pytest.mark.parametrize(
    ("J1", "J2", "location"),
    [
        (1, "-0.25", "0.82050896496424416101"),
        (-1, "-0.25", "0.82050896496424416101"),
        (1, "-0.3", "0.60951825606995181141578670"),
    ],
)
def test_disorder_point_of_the_zigzag_chain(J1, J2, location):
    """D03: cosh(J1/T) = exp(2|J2|/T). J. Stephenson, Can. J. Phys. 48, 1724 (1970), from memory."""
    point = only(crossovers(ZIGZAG.fix(J1=J1, J2=J2), "T", (0.1, 10)), "disorder point")
    near(point.location, location, "1e-13")
    assert point.error < 1e-13 and "seen by the slowest mode, m" in point.note
    assert ("monotonic" if J1 > 0 else "alternating") in point.note and "decay above" in point.note


def test_the_same_point_is_found_along_a_coupling():
    """D03 read the other way round: at that temperature J2 = −1/4."""
    chain = ZIGZAG.fix(J1=1, T="0.82050896496424416101")
    point = only(crossovers(chain, "J2", (-2, 1)), "disorder point")
    assert point.location == pytest.approx(-0.25, abs=1e-14) and "decay below" in point.note


def test_height_and_width_of_a_disorder_point_are_length_and_square_root_law():
    """Near T_D the wave number is √((T − T_D)/width), and ξ is finite there."""
    chain = ZIGZAG.fix(J1=1, J2="-0.25")
    point = only(crossovers(chain, "T", (0.1, 10)), "disorder point")
    above = solve(chain.at(T=point.location + 1e-8))
    assert float(above.wave_number()) == pytest.approx(math.sqrt(1e-8 / point.width), rel=1e-3)
    assert float(above.correlation_length()) == pytest.approx(point.height, rel=1e-6)


@pytest.mark.parametrize(
    ("ratio", "location", "height"),
    [
        ("1/2", "0.4488724751732657", "0.2407779244776542"),
        ("1", "0.4167782798004823", "0.4392288398906452"),
        ("2", "0.3766963617811565", "0.7618022376898002"),
        ("3", "0.3514952120715447", "1.023490554386505"),
        ("5", "0.3199525191530935", "1.44213091150882"),
    ],
)
def test_schottky_peaks(ratio, location, height):
    """F03: two levels with degeneracy ratio g1/g0. Gopal, Specific Heats at Low Temperatures (1966), from memory."""
    from fractions import Fraction

    g = Fraction(ratio)
    chain = Chain(StateSet([0, 1], weights=[g.denominator, g.numerator]), [site(lambda s, gap: gap * s)])
    peak = only(crossovers(chain.fix(gap=1), "T", (0.02, 10)), "maximum of specific_heat")
    near(peak.location, location, "1e-12")
    near(peak.height, height, "1e-12")


LADDER = Chain(
    {"a": ising(), "b": ising(), "t": ising()},
    [
        bond(lambda s, t, J: -J * s * t, ("a", "a")),
        bond(lambda s, t, J: -J * s * t, ("b", "b")),
        bond(lambda s, t, R: -R * s * t, ("a", "b"), shift=0),
        bond(lambda s, t, Q: -Q * s * t, ("t", "a"), shift=0),
        bond(lambda s, t, Q: -Q * s * t, ("t", "b"), shift=0),
    ],
    {"rung": bond(lambda s, t: s * t, ("a", "b"), shift=0)},
)


def test_a_needle_is_found_on_a_wide_line():
    """E01: frustrated ladder, effective rung coupling zero at T0. W. Yin, Phys. Rev. Research 6, 013331 (2024)."""
    events = crossovers(LADDER.fix(J=1, R="-0.9", Q=1), "T", (0.05, 50))
    near(only(events, "half-way of rung").location, "0.28853940517534981788", "1e-14")
    peak = next(e for e in events if e.kind == "maximum of specific_heat")
    assert peak.width < 1e-3 and peak.height > 60 and abs(peak.location - 0.28853940517534981788) < peak.width


@pytest.mark.parametrize(("J", "width", "peaks"), [("4", 1e-11, 1), ("12", 1e-15, 0)])
def test_ever_narrower_needles_are_found(J, width, peaks):
    """The crossover of E01 narrows with the leg coupling and does not move; at last doubles cannot resolve it."""
    events = crossovers(LADDER.fix(J=J, R="-0.9", Q=1), "T", (0.2, 5), watch=["specific_heat", "mean(rung)"])
    point = only(events, "half-way of rung")
    exact = 0.28853940517534981788
    assert abs(point.location - exact) <= point.error < 5e-14 and point.width < width
    assert ("neighbouring" in point.note) is (J == "12")
    near_it = [e for e in events if e.kind == "maximum of specific_heat" and abs(e.location - exact) < width]
    assert len(near_it) == peaks


def test_a_degenerate_down_state():
    """E15: half-way of the spin of a chain with g = 4, h = 0.9, J = 2 at 2h/ln g. Doniach's lipid chain (1979)."""
    chain = Chain(
        StateSet([1, -1], weights=[1, 4]),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
        {"s": lambda s: s},
    )
    point = only(crossovers(chain.fix(J=2, h="0.9"), "T", (0.1, 10)), "half-way of s")
    near(point.location, "1.2984255368000670666", "1e-14")
    level = only(crossovers(chain.fix(J=2, h="0.9"), "T", (0.1, 10), level={"s": 0}), "half-way of s")
    assert level.location == point.location


def test_every_location_is_a_root_of_the_exact_derivative():
    chain = BLUME_CAPEL.fix(J=1, D="0.9")
    for event in crossovers(chain, "T", (0.05, 10)):
        quantity = event.kind.removeprefix("maximum of ")
        solution = solve(chain.at(T=event.location))
        slope, curvature = (float(solution.derivative(*names, of=quantity)) for names in (("T",), ("T", "T")))
        assert abs(slope / curvature) <= 3 * event.error and curvature < 0
        assert event.height == pytest.approx(float(solution.derivative(of=quantity)), rel=1e-12)
        assert event.width == pytest.approx(math.sqrt(-event.height / curvature), rel=1e-6)


def test_width_of_a_half_way_point_is_range_over_slope():
    chain = BLUME_CAPEL.fix(J=1, T="0.3")
    point = only(crossovers(chain, "D", (0, 2)), "half-way of q")
    slope = float(solve(chain.at(D=point.location)).derivative("D", of="mean(q)"))
    assert point.width == pytest.approx(1 / abs(slope), rel=1e-9)


def test_disorder_points_of_multiplets():
    """The odd modes of a 3-state chain come in pairs by symmetry; both of them merge at once."""
    chain = Chain(
        colours(3),
        [bond(lambda s, t, J1: -J1 * delta(s, t)), bond(lambda s, t, J2: -J2 * delta(s, t), shift=2)],
        {"p": lambda s: delta(s, 0)},
    ).fix(J1=1, J2="-0.3")
    point = only(crossovers(chain, "T", (0.1, 5), watch="disorder"), "disorder point")
    below, above = (solve(chain.at(T=point.location * (1 + d))) for d in (-1e-6, 1e-6))
    assert float(below.wave_number("p")) == 0 and float(above.wave_number("p")) > 1e-4
    assert point.error < 1e-13


def test_complex_modes_without_a_merging_are_no_event():
    """A chiral clock's modes are complex at every temperature, so nothing merges."""
    from tmsolve import cos_turns

    chain = Chain(clock(3), [bond(lambda s, t, J: -J * cos_turns(4 * (s - t) + 1, 12))]).fix(J=1)
    T = np.linspace(0.3, 3, 5)
    assert (solve(chain.at(T=T)).wave_number() > 0).all()
    assert not [e for e in crossovers(chain, "T", (0.3, 3)) if e.kind == "disorder point"]
