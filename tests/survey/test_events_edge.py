"""Where there is no event, where the search must not be fooled, and what is refused."""

import math

import numpy as np
import pytest

from tests.facts.near import only
from tests.refusal import refused
from tests.survey.chains import BLUME_CAPEL, FROZEN, ISING, ZIGZAG
from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    SolveError,
    bond,
    colours,
    crossovers,
    delta,
    ising,
    occupation,
    site,
    solve,
    spins,
)
from tmsolve.survey.event import Event


def test_nothing_happens_to_free_spins():
    chain = Chain(ising(), [bond(lambda s, t: 0)], {"m": lambda s: s, "one": lambda s: 1})
    assert crossovers(chain, "T", (0.01, 100)) == ()


def test_a_mean_that_vanishes_by_symmetry_is_no_half_way_point():
    events = crossovers(BLUME_CAPEL.fix(J=1, T="0.1"), "D", (0, 8))
    assert not [e for e in events if e.kind == "half-way of m"]


def test_a_constant_product_of_temperature_and_susceptibility_is_no_maximum():
    chain = Chain(spins(1), [site(lambda s, J: 0 * J)], {"m": lambda s: s}).fix(J=1)
    assert crossovers(chain, "T", (0.1, 10)) == ()


def test_the_ends_are_no_events():
    """c of the Ising chain still rises at 0.8 and has been falling at 0.9; the peak is at 0.83356."""
    assert crossovers(ISING.fix(J=1), "T", (0.1, 0.8), watch="specific_heat") == ()
    assert crossovers(ISING.fix(J=1), "T", (0.9, 5), watch="specific_heat") == ()
    at_the_end = solve(BLUME_CAPEL.at(J=1, T="0.7", D=1.0390907390325650)).mean("q")
    assert at_the_end == pytest.approx(0.5, abs=1e-15)


def test_minima_are_no_events():
    """At the middle of its field axis c of the Ising chain has a minimum between two maxima."""
    events = crossovers(ISING.fix(J=1, T=1), "h", (-2, 3), watch="specific_heat")
    assert len(events) == 2 and all(abs(e.location) > 0.1 for e in events)
    assert events[0].location == pytest.approx(-events[1].location, rel=1e-13)


def test_an_event_at_zero_has_an_absolute_error():
    peak = only(crossovers(ISING.fix(J=1, T=1), "h", (-2, 3)), "maximum of susceptibility(m)")
    assert abs(peak.location) <= peak.error < 1e-13


def test_a_crossing_of_modes_is_no_disorder_point():
    """Legs and rungs compete: modes of different symmetry exchange their rank and stay real."""
    ladder = Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "a")),
            bond(lambda s, t, J: -J * s * t, ("b", "b")),
            bond(lambda s, t, R: -R * s * t, ("a", "b"), shift=0),
        ],
        {"sum": lambda s: s, "rung": bond(lambda s, t: s * t, ("a", "b"), shift=0)},
    ).fix(J="0.4", T=1)
    gaps = solve(ladder.at(R=np.array([-0.01, 0.01]))).gaps(2)
    assert np.ptp(gaps[:, 0]) < 1e-3, "the two modes have just crossed"
    assert not [e for e in crossovers(ladder, "R", (-1, 1.3)) if e.kind == "disorder point"]


def test_modes_of_zero_are_not_taken_for_pairs():
    """Without next-nearest coupling half of the eigenvalues of the 9 × 9 matrix are zero and defective."""
    chain = Chain(
        spins(1), [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: K * s * t, shift=2)], {"m": lambda s: s}
    )
    assert not [e for e in crossovers(chain.fix(J=1, K=0), "T", (0.1, 5)) if e.kind == "disorder point"]


def test_a_pair_that_merges_and_parts_between_two_points():
    """A made-up chain with oscillating decay only for 2.11 < h < 2.165 on a line of length 8."""
    pair = [
        [-0.7, 0.14, -0.29, 1.44],
        [0.0, 0.32, 0.95, -0.3],
        [1.44, -0.63, -0.81, -0.37],
        [-0.11, -1.4, -0.04, -1.67],
    ]
    single, a = [1.39, -0.08, -0.64, -0.91], [1, -1, 0, 0]
    chain = Chain(
        colours(4), [bond(lambda s, t: pair[s][t]), site(lambda s, h: single[s] - h * a[s])], {"a": lambda s: a[s]}
    )
    chain = chain.fix(T="0.4")
    points = [e for e in crossovers(chain, "h", (-4, 4), watch="disorder") if 2 < e.location < 2.3]
    assert len(points) == 2 and all(e.error < 1e-9 for e in points)
    waves = solve(
        chain.at(h=[points[0].location - 1e-4, np.mean([e.location for e in points]), points[1].location + 1e-4])
    )
    assert (waves.wave_number() > 0).tolist() == [False, True, False]


def test_two_peaks_close_together_are_both_found():
    """The field axis of a ferromagnetic chain at low T: maxima at ±1.2e-5 on a line of length 8."""
    places = [e.location for e in crossovers(ISING.fix(J=1, T="0.2"), "h", (-3, 5), watch="specific_heat")]
    assert len(places) == 2 and 0 < places[1] < 2e-5
    assert places[0] == pytest.approx(-places[1], rel=1e-11)


def test_a_jump_between_classes_is_no_event():
    """Two classes that never mix exchange their rank at mu = 0; nothing is smooth there, and nothing is lost."""
    assert crossovers(FROZEN.fix(T=1), "mu", (-1.01, 1)) == ()
    assert crossovers(FROZEN.fix(T=1), "mu", (-1, 1)) == ()


def test_unsolved_points_raise_and_keep_the_events_found_elsewhere():
    def steep(s, D):
        # No energy at all where D > 1, which makes every configuration forbidden there.
        return math.inf if D > 1 else D * s * s

    chain = Chain(spins(1), [bond(lambda s, t: -s * t), site(steep)], {"q": lambda s: s * s}).fix(T="0.4")
    with pytest.raises(SolveError) as caught:
        crossovers(chain, "D", (0, 1.5), watch=["specific_heat", "mean(q)"])
    assert "D = " in str(caught.value) and ".partial" in str(caught.value)
    whole = BLUME_CAPEL.fix(J=1, T="0.4")
    expected = [e.location for e in crossovers(whole, "D", (0, 0.99), watch=["specific_heat", "mean(q)"])]
    assert [e.location for e in caught.value.partial] == pytest.approx(expected, rel=1e-12)


def test_forbidden_configurations_narrow_the_range_of_an_observable():
    """With neighbours excluded the density reaches 1/2 only, so half-way is 1/4."""
    chain = Chain(
        occupation(), [bond(lambda s, t: math.inf if s * t else 0), site(lambda s, mu: -mu * s)], {"n": lambda s: s}
    )
    point = only(crossovers(chain.fix(T=1), "mu", (-5, 5)), "half-way of n")
    z = math.exp(point.location)
    assert 0.5 * (1 - 1 / math.sqrt(1 + 4 * z)) == pytest.approx(0.25, rel=1e-13)


def test_levels_can_be_chosen():
    chain = BLUME_CAPEL.fix(J=1, T="0.7")
    events = crossovers(chain, "D", (-2, 4), level={"q": "0.75"}, watch=["mean(q)", "mean(m)"])
    (point,) = events
    assert point.kind == "half-way of q" and point.height == pytest.approx(0.75, rel=1e-12)
    (point,) = crossovers(chain, "D", (-2, 4), level=0.25, watch="mean(q)")
    assert point.height == pytest.approx(0.25, rel=1e-12)


def test_an_observable_that_depends_on_the_line_has_a_level_that_moves():
    """⟨g·n⟩ of free particles is half-way between 0 and g where n = 1/2, whatever g is: at mu = 0."""
    chain = Chain(occupation(), [site(lambda s, mu: -mu * s)], {"moment": lambda s, mu: (2 + mu) * s})
    point = only(crossovers(chain.fix(T=1), "mu", (-1, 1.3)), "half-way of moment")
    assert abs(point.location) < 1e-9


def test_watching_less_finds_the_same():
    chain = ZIGZAG.fix(J1=1, J2="-0.25")
    everything = crossovers(chain, "T", (0.2, 3))
    for name, kind in (("specific_heat", "maximum of specific_heat"), ("disorder", "disorder point")):
        (alone,) = crossovers(chain, "T", (0.2, 3), watch=[name])
        assert alone.location == pytest.approx(only(everything, kind).location, rel=1e-13)


def test_maxima_of_other_quantities_can_be_watched():
    """s of two levels with a field axis is largest at h = 0."""
    (peak,) = crossovers(ISING.fix(J=0, T=1), "h", (-1, 2), watch="entropy")
    assert peak.kind == "maximum of entropy" and peak.height == pytest.approx(math.log(2), rel=1e-14)
    (cross,) = crossovers(BLUME_CAPEL.fix(J=1, T="0.5", D=1), "h", (0.01, 3), watch="susceptibility(m,q)")
    assert cross.kind == "maximum of susceptibility(m,q)"


def test_events_come_in_order_and_can_be_read():
    events = crossovers(BLUME_CAPEL.fix(J=1, D="0.9"), "T", (0.05, 10))
    assert [e.location for e in events] == sorted(e.location for e in events)
    assert str(Event("half-way of q", "D", 1.5, 2e-15, 0.5, 0.25, "a note")) == (
        "half-way of q at D = 1.5 ± 2e-15: height 0.5, width 0.25 (a note)"
    )


CHAIN = BLUME_CAPEL.fix(J=1, D="0.9")


@pytest.mark.parametrize(
    ("arguments", "options", "fragments"),
    [
        ((CHAIN, "t", (0.1, 1)), {}, ("along='t'", "Did you mean 'T'?")),
        ((CHAIN, "D", (0.1, 1)), {}, ("'D' is fixed", "before fix(…)")),
        ((BLUME_CAPEL.fix(J=1), "T", (0.1, 1)), {}, ("no value for D", "chain.fix(D=…)")),
        ((BLUME_CAPEL.fix(J=1), "D", (0.1, 1)), {}, ("no value for T", "chain.fix(T=…)")),
        ((CHAIN, "T", (1, 0.1)), {}, ("lower end first", "(1, 0.1)")),
        ((CHAIN, "T", (1, 1)), {}, ("lower end first",)),
        ((CHAIN, "T", 1), {}, ("two ends", "(0.1, 2)", "got 1")),
        ((CHAIN, "T", "12"), {}, ("two ends", "'12'")),
        ((CHAIN, "T", (0.1, 1, 2)), {}, ("two ends",)),
        ((CHAIN, "T", (0.1, math.nan)), {}, ("NaN",)),
        ((CHAIN, "T", (0.1, math.inf)), {}, ("finite",)),
        ((CHAIN, "T", ("low", 1)), {}, ("'low'",)),
        ((CHAIN.at(T=1), "T", (0.1, 1)), {}, ("takes a chain", "Point")),
        ((CHAIN, "T", (0.1, 1)), {"watch": "specific_heta"}, ("specific_heta", "Did you mean 'specific_heat'?")),
        ((CHAIN, "T", (0.1, 1)), {"watch": "mean(Q)"}, ("'Q'", "Did you mean 'q'?")),
        ((CHAIN, "T", (0.1, 1)), {"watch": ["disordr"]}, ("disordr", "Did you mean 'disorder'?")),
        ((CHAIN, "T", (0.1, 1)), {"level": {"Q": 0}}, ("'Q'", "Did you mean 'q'?")),
        ((CHAIN, "T", (0.1, 1)), {"level": {"q": "half"}}, ("level of q", "'half'")),
        ((CHAIN, "T", (0.1, 1)), {"level": math.nan}, ("level of", "NaN")),
        ((CHAIN, "T", (0.1, 1)), {"points": 3}, ("points", ">= 5", "got 3")),
    ],
    ids=lambda value: str(value) if isinstance(value, dict) else "",
)
def test_refusals(arguments, options, fragments):
    refused(ParameterError, lambda: crossovers(*arguments, **options), *fragments)


def test_what_does_not_apply_is_said():
    refused(NotApplicable, lambda: crossovers(CHAIN, "T", (0, 1)), "T > 0", "0.0")
    refused(
        NotApplicable, lambda: crossovers(CHAIN, "T", (0.1, 1), watch="correlation_length"),
        "correlation_length", "specific_heat", "'disorder'",
    )  # fmt: skip


def test_potts_delta_observables_have_their_range():
    chain = Chain(
        colours(3),
        [bond(lambda s, t, J: -J * delta(s, t)), site(lambda s, h: -h * (s == 0))],
        {"p": lambda s: delta(s, 0)},
    )
    point = only(crossovers(chain.fix(J=1, T=1), "h", (-5, 5)), "half-way of p")
    assert float(solve(chain.at(J=1, T=1, h=point.location)).mean("p")) == pytest.approx(0.5, abs=1e-14)
