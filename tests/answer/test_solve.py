"""The verb solve: what it takes and refuses, classes of states, batches of unequal points, large matrices."""

import math
import time
import warnings

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.refusal import refused
from tmsolve import (
    Chain,
    DeclarationError,
    NotApplicable,
    ParameterError,
    SolveError,
    StateSet,
    TooLargeError,
    bond,
    colours,
    ising,
    occupation,
    site,
    solve,
    spins,
    weight,
)
from tmsolve.eigen.solvers import Auto, Dense

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h=0: -h * s)], observables={"m": lambda s: s})
POINT = ISING.at(T=1, J=1)
#: Bond between unlike states forbidden: two classes that never mix.
FROZEN = Chain(
    ising(), [bond(lambda s, t: math.inf if s != t else 0), site(lambda s, h: -h * s)], observables={"m": lambda s: s}
)


WEIGHED = Chain(ising(), [weight(lambda s, w: w if s > 0 else 1)])


def broken(s, h):
    raise RuntimeError("no data")


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda: solve(ISING), ParameterError, ("solve takes a point", "solve(chain.at(T=…, …))")),
        (lambda: solve({"T": 1}), ParameterError, ("solve takes a point, got {'T': 1}", "make one with chain.at")),
        (lambda: solve(POINT, solver="dense"), ParameterError, ("Auto() or Dense(…), got 'dense'",)),
        (lambda: solve(POINT, solver=Dense), ParameterError, ("Auto() or Dense(…), got <class",)),
        (lambda: solve(WEIGHED.at(T=0, w=2)), NotApplicable, ("weight(…)", "no ground state", "small T > 0")),
        (lambda: solve(WEIGHED.at(T=[1, 0], w=2)), NotApplicable, ("no ground state",)),
        (lambda: solve(ISING.at(T=0, J=1)).spectrum(), NotApplicable, ("at T = 0", "gaps(k)")),
        (lambda: solve(POINT, solver=Dense(max_size=1)), TooLargeError, ("limited to 1 states; this chain has 2",)),
        (lambda: solve(POINT, digits=0), ParameterError, ("digits", "got 0")),
        (lambda: solve(POINT, digits=2.5), ParameterError, ("digits", "got 2.5")),
        (
            lambda: solve(Chain(ising(), [bond(lambda s, t: math.inf)]).at(T=1)),
            SolveError,
            ("every configuration of the infinite chain is forbidden", "math.inf"),
        ),
        (
            lambda: solve(Chain(colours(3), [bond(lambda s, t: math.inf if t <= s else 0)]).at(T=1)),
            SolveError,
            ("every configuration of the infinite chain is forbidden at Point(T=1)",),
        ),
        (
            lambda: solve(Chain(ising(), [weight(lambda s, w: w, 0)]).at(T=1, w=[1, 0])),
            SolveError,
            ("is forbidden at Point(w=0, T=1)", "weight 0"),
        ),
        (
            lambda: solve(FROZEN.at(T=1, h=0)),
            SolveError,
            ("never mix and tie in free energy at Point(h=0, T=1)", "{-1} and {1}", "lift the tie with a field"),
        ),
        (
            lambda: solve(FROZEN.at(T=1, h=[1, 2, 0])),
            SolveError,
            ("tie in free energy at Point(h=0, T=1)",),
        ),
        (
            lambda: solve(Chain(ising(), [site(broken)]).at(T=1, h=1)),
            SolveError,
            ("broken(-1, h=1) raised RuntimeError",),
        ),
        (
            lambda: solve(Chain(ising(), [site(lambda s, h: h * (s == 1) * math.inf)]).at(T=1, h=0)),
            SolveError,
            ("returned NaN", "inf*0"),
        ),
        (
            lambda: solve(Chain(ising(), [bond(lambda s, t: s == t)]).at(T=1)),
            DeclarationError,
            ("returned the bool", "delta(s, t)"),
        ),
        (
            lambda: solve(ISING.at(T=1, J=math.inf)),
            SolveError,
            ("parameter 'J' is infinite", "returning math.inf from the term"),
        ),
        (
            lambda: solve(Chain(ising(), [], observables={"m": lambda s: math.inf * s}).at(T=1)).mean("m"),
            SolveError,
            ("infinite value", "finite on every state"),
        ),
        (
            lambda: solve(Chain(ising(), [], observables={"m": lambda s: "up"}).at(T=1)).mean("m"),
            DeclarationError,
            ("returned 'up'", "an observable is a real number"),
        ),
    ],
)
def test_refused(act, error, fragments):
    refused(error, act, *fragments)


def test_the_larger_class_answers_on_each_side_of_a_tie():
    r = solve(FROZEN.at(T=1, h=[-0.5, 0.5]))
    assert r.mean("m").tolist() == [-1, 1] and r.free_energy == pytest.approx(np.array([-0.5, -0.5]))
    assert r.correlation("m", "m", 1, connected=False).tolist() == [1, 1]
    assert solve(FROZEN.at(T=1, h=0.5)).spectrum()[1].log_modulus == pytest.approx(-0.5)


def test_transient_states_do_not_matter():
    """0 → 1 → 2 → 2: only state 2 recurs; state 0 has a loop of higher energy."""
    steps = {(0, 0): 1.0, (0, 1): 0.0, (1, 2): 0.0, (2, 2): 0.25}
    chain = Chain(StateSet([0, 1, 2]), [bond(lambda s, t: steps.get((s, t), math.inf))], observables={"n": lambda s: s})
    r = solve(chain.at(T=0.5))
    assert float(r.free_energy) == 0.25 and float(r.mean("n")) == 2 and float(r.entropy) == 0
    assert [level.log_modulus for level in r.spectrum()] == pytest.approx([-0.5, -2.0])


def test_periodic_chains():
    """Strict alternation of two sublattices, and of three."""
    for q in (2, 3):
        chain = Chain(
            colours(q),
            [bond(lambda s, t, q=q: 0 if (t - s) % q == 1 else math.inf)],
            observables={"n": lambda s: s == 0},
        )
        chain = Chain(chain.cell["s"], chain.terms, observables={"n": lambda s: int(s == 0)})
        r = solve(chain.at(T=1))
        assert float(r.free_energy) == 0 and float(r.mean("n")) == pytest.approx(1 / q)
        assert float(r.correlation_length("n")) == math.inf
        assert float(r.wave_number("n")) == pytest.approx(2 * math.pi / q)
        assert r.correlation("n", "n", range(q), connected=False) == pytest.approx([1 / q] + [0] * (q - 1))
        assert [level.multiplicity for level in r.spectrum()] == [1] * q


FICKLE = Chain(
    spins(1),
    [
        bond(lambda s, t, J: -J * s * t),
        site(lambda s, D: math.inf if D > 5 and s == 0 else D * s * s),
        bond(lambda s, t, J: math.inf if J < -2 and s == t != 0 else 0),
    ],
    observables={"m": lambda s: s, "q": lambda s: s * s, "e": bond(lambda s, t: s * t, shift=2)},
)
READ = {
    "f": lambda r: r.free_energy,
    "u": lambda r: r.internal_energy,
    "s": lambda r: r.entropy,
    "c": lambda r: r.specific_heat,
    "mean": lambda r: r.mean("q"),
    "chi": lambda r: r.susceptibility("m", "q"),
    "T chi": lambda r: r.temperature_susceptibility("e"),
    "slope": lambda r: r.derivative("D", "T", of="mean(q)"),
    "correlation": lambda r: r.correlation("m", "e", [-1, 0, 3]),
    "length": lambda r: r.correlation_length("q"),
    "wave": lambda r: r.wave_number("m"),
    "gaps": lambda r: r.gaps(3),
}


@pytest.mark.parametrize("name", READ)
def test_a_batch_of_unequal_points_is_a_loop(name):
    """Patterns of forbidden configurations, classes and lengths of numbers differ from point to point."""
    J, D, T = np.array([[1.0], [-1.0], [-3.0]]), np.array([0.3, 2.0, 7.0]), np.array([[0.4], [2.0], [0.9]])
    batch = solve(FICKLE.at(T=T, J=J, D=D))
    got = READ[name](batch)
    assert got.shape[:2] == (3, 3)
    for index in np.ndindex(3, 3):
        alone = READ[name](solve(batch.point.pick(3 * index[0] + index[1])))
        assert got[index] == pytest.approx(alone, rel=1e-10, abs=1e-12)


@settings(max_examples=40)
@given(
    st.floats(-6, 6).map(lambda x: 10.0**x),
    st.lists(st.tuples(st.sampled_from([-1, 1]), st.floats(-6, 6)), min_size=3, max_size=3),
    st.sampled_from([Chain(spins(1), FICKLE.terms[:1] + ISING.terms[1:], observables={"m": lambda s: s}), ISING]),
)
def test_twelve_decades_of_everything(T, numbers, chain):
    """No warning, no NaN, and the signs that thermodynamics demands."""
    J, h, other = (sign * 10.0**x for sign, x in numbers)
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        r = solve(chain.at(T=[T, T], J=[J, other], h=h))
        found = [r.free_energy, r.internal_energy, r.entropy, r.specific_heat, r.mean("m"), r.susceptibility("m")]
        found += [r.correlation_length(), r.correlation_length("m"), r.correlation("m", "m", [0, 1, 50])[..., 0]]
    assert not any(np.isnan(x).any() for x in found)
    assert (r.entropy >= 0).all() and (r.entropy <= math.log(3) + 1e-12).all()
    assert (r.specific_heat >= 0).all() and (r.susceptibility("m") >= 0).all() and (np.abs(r.mean("m")) <= 1).all()
    scale = abs(J) + abs(h) + abs(other) + T
    assert np.abs(r.free_energy - (r.internal_energy - T * r.entropy)).max() <= 1e-12 * scale


LONG = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=4), site(lambda s, D: D * s * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s},
)


def test_large_matrices_obey_exact_limits():
    """81 states. K = 0 is the nearest-neighbour chain; J = 0 is four chains side by side."""
    near = Chain(spins(1), [LONG.terms[0], LONG.terms[2]], observables={"m": lambda s: s, "q": lambda s: s * s})
    values = {"T": "0.8", "D": "0.4"}
    narrow = solve(near.at(J=1, **values))
    for wide, factor in ((solve(LONG.at(J=1, K=0, **values)), 1), (solve(LONG.at(J=0, K=1, **values)), 4)):
        assert wide.diagnostics["matrix"] == (81, 81)
        for quantity in ("free_energy", "entropy", "specific_heat"):
            assert float(getattr(wide, quantity)) == pytest.approx(float(getattr(narrow, quantity)), rel=1e-11)
        assert float(wide.susceptibility("m")) == pytest.approx(float(narrow.susceptibility("m")), rel=1e-9)
        assert float(wide.correlation_length("m")) == pytest.approx(
            factor * float(narrow.correlation_length("m")), rel=1e-8
        )


@pytest.mark.parametrize("T", [0.5, 1.0, 1e3, 1e6])
def test_large_matrices_are_consistent(T):
    r = solve(LONG.at(T=T, J=1, K="-0.3", D="0.2"))
    step = 1e-4 * T
    beside = solve(LONG.at(T=[T - step, T + step], J=1, K="-0.3", D="0.2"))
    assert float(r.entropy) == pytest.approx(-np.diff(beside.free_energy)[0] / (2 * step), rel=1e-5)
    assert float(r.specific_heat) == pytest.approx(np.diff(beside.internal_energy)[0] / (2 * step), rel=1e-4, abs=1e-12)
    assert r.diagnostics["vector_error"] < 1e-8


def test_where_doubles_end_a_large_matrix_is_an_error(monkeypatch):
    monkeypatch.setattr("tmsolve.operators.midpoints.flint_module", lambda: None)
    monkeypatch.setattr("tmsolve.answer.classes.flint_module", lambda: None)
    refused(
        SolveError,
        lambda: solve(LONG.at(T="1e-3", J=1, K="0.5", D=0)).free_energy,
        "could not be separated at Point(J=1, K=0.5, D=0, T=0.001)",
        "more than 40 states get no longer numbers",
        '(up to 100 with python-flint: python -m pip install "tmsolve[certified]")',
        "raise the temperature",
    )


@pytest.mark.slow
@pytest.mark.parametrize(("shift", "size", "seconds"), [(5, 243, 60), (6, 729, 600)])
def test_very_large_matrices(shift, size, seconds):
    chain = Chain(
        spins(1),
        [bond(lambda s, t, K: -K * s * t, shift=shift), site(lambda s, D: D * s * s)],
        observables={"m": lambda s: s},
    )
    start = time.perf_counter()
    wide = solve(chain.at(T="0.9", K=1, D="0.3"))
    found = float(wide.free_energy), float(wide.specific_heat), float(wide.susceptibility("m"))
    assert time.perf_counter() - start < seconds
    narrow = solve(
        Chain(spins(1), [bond(lambda s, t, K: -K * s * t), chain.terms[1]], observables={"m": lambda s: s}).at(
            T="0.9", K=1, D="0.3"
        )
    )
    assert wide.diagnostics["matrix"] == (size, size)
    expected = float(narrow.free_energy), float(narrow.specific_heat), float(narrow.susceptibility("m"))
    assert found == pytest.approx(expected, rel=1e-8)


def test_solver_choices_can_be_looked_at():
    assert Auto().select(9) == Dense()
    error = refused(TooLargeError, lambda: Dense(max_size=10).check(11), "limited to 10 states", "Dense(max_size=11)")
    assert error.limit == 10


def test_hard_core_particles_without_parameters():
    """No parameter but T: entropy ln golden ratio at every temperature."""
    chain = Chain(occupation(), [bond(lambda s, t: math.inf if s * t else 0)], observables={"n": lambda s: s})
    r = solve(chain.at(T=[1e-6, 1, 1e6]))
    golden = (1 + math.sqrt(5)) / 2
    assert r.entropy == pytest.approx(np.full(3, math.log(golden)), rel=1e-14)
    assert r.mean("n") == pytest.approx(np.full(3, 1 / (golden**2 + 1)), rel=1e-14)
    assert r.specific_heat.tolist() == [0, 0, 0] and r.internal_energy.tolist() == [0, 0, 0]
