"""Exported NumPy functions: right at any temperature, alone in a script, refused where they would not be right."""

import math
import subprocess
import sys

import numpy as np
import pytest

from tests.symbolic.refusing import refuses
from tmsolve import Chain, StateSet, bond, closed_form, colours, delta, ising, models, site, solve, spins, weight
from tmsolve.errors import NotApplicable, ParameterError, SolveError
from tmsolve.symbolic.export import numpy_check
from tmsolve.symbolic.export.numpy_function import numpy_function, numpy_source

FIELD = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], {"m": lambda s: s})
CAPEL = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)],
    {"m": lambda s: s, "q": lambda s: s * s},
)
THERMAL = ("free_energy", "internal_energy", "entropy", "specific_heat")


@pytest.fixture(scope="module")
def field():
    return closed_form(FIELD)


@pytest.fixture(scope="module")
def capel():
    return closed_form(CAPEL)


@pytest.mark.parametrize("quantity", [*THERMAL, "correlation_length", "mean(m)", "susceptibility(m)"])
def test_ising_in_a_field_at_all_temperatures(field, quantity):
    function = numpy_function(field, quantity, solver=solve)
    T = np.array([20.0, 2.0, 0.5, 0.1, 0.02])
    for J, h in ((1.0, 0.3), (-0.8, 0.3), (1.0, 0.0), (0.5, -1.0)):
        solution = solve(FIELD.at(T=T, J=J, h=h))
        name, _, inside = quantity.partition("(")
        member = getattr(solution, name)
        expected = member(inside.rstrip(")")) if inside else member() if callable(member) else member
        assert function(T, J, h) == pytest.approx(np.asarray(expected), rel=1e-9, abs=1e-12 if name == "mean" else 0)


@pytest.mark.parametrize("quantity", THERMAL)
def test_blume_capel_across_its_phase_boundary(capel, quantity):
    function = numpy_function(capel, quantity)
    T, D = np.array([[2.0], [0.3], [0.05], [0.01]]), np.array([-1.0, 0.5, 0.999, 1.0, 1.001, 1.7])
    expected = np.asarray(getattr(solve(CAPEL.at(T=T, J=1, D=D)), quantity))
    # Where two phases tie to rounding of the parameters over T, so do the results.
    assert function(T, 1.0, D) == pytest.approx(expected, rel=1e-9, abs=1e-290)


def test_correlation_lengths_beyond_what_a_quotient_can_say(capel):
    function = numpy_function(capel, "xi")
    T = np.array([1.0, 0.1, 0.02])
    expected = np.asarray(solve(CAPEL.at(T=T, J=1, D="0.2")).correlation_length())
    assert function(T, 1.0, 0.2) == pytest.approx(expected, rel=1e-9) and expected[-1] > 1e38


@pytest.mark.parametrize(
    "name, fixed",
    [
        ("lattice_gas", {}),
        ("helix_coil", {}),
        pytest.param("ladder", {"h": 0}, marks=pytest.mark.slow),
        pytest.param("clock", {"h": 0}, marks=pytest.mark.slow),
    ],
)
def test_shipped_models(name, fixed):
    form = closed_form(models.load(name).chain.fix(**fixed))
    for quantity in ("f", "c", "xi"):
        numpy_function(form, quantity, solver=solve)


def test_symbolic_number_of_colours():
    potts = Chain(colours("q"), [bond(lambda s, t, J: -J * delta(s, t))])
    form = closed_form(potts)
    function = numpy_function(form, "f")
    assert function(T=0.01, J=1, q=5) == pytest.approx(-1.0)
    assert function(0.8, 0.6, 5) == pytest.approx(-0.8 * math.log(math.exp(0.75) + 4), rel=1e-14)
    with refuses(NotApplicable, "leave solver= out"):
        numpy_function(form, "f", solver=solve)


def test_zero_diagonal_and_alternation():
    chain = Chain(ising(), [bond(lambda s, t, J: math.inf if s == t else -J)])
    assert numpy_function(closed_form(chain), "f")(T=0.01, J=2) == -2
    assert numpy_function(closed_form(chain), "entropy")(T=1, J=2) == 0


def test_cubic_eigenvalues_are_exported_where_they_hold():
    chain = Chain(spins(1), [*CAPEL.terms, site(lambda s, h: -h * s)])
    form = closed_form(chain)
    numpy_function(form, "free_energy", solver=solve)
    with refuses(SolveError, "NumPy function of entropy", "cancel there", "use solve".capitalize()):
        numpy_function(form, "entropy")


def test_source_stands_alone(field, tmp_path):
    path = tmp_path / "script.py"
    path.write_text(numpy_source(field, "c") + "\nprint(repr(float(specific_heat(0.25, 1.0, 0.5))))\n")
    code = "import sys, runpy; runpy.run_path(sys.argv[1]); assert not [m for m in sys.modules if m.startswith('tm')]"
    run = subprocess.run([sys.executable, "-I", "-c", code, str(path)], capture_output=True, text=True)
    assert run.returncode == 0, run.stderr
    assert float(run.stdout) == pytest.approx(float(solve(FIELD.at(T="0.25", J=1, h="0.5")).specific_heat), rel=1e-10)
    assert [line for line in path.read_text().splitlines() if "import" in line] == ["import numpy"]


def test_arrays_broadcast_and_temperatures_are_checked(field):
    function = numpy_function(field, "f")
    assert function([[1.0], [2.0]], [0.5, 1.0, 1.5], 0.1).shape == (2, 3)
    assert np.shape(function(1.0, 1.0, 0.0)) == ()
    nothing = numpy_function(closed_form(FIELD.fix(h=0)), "mean(m)")
    assert nothing([1.0, 2.0], [[1.0], [2.0]]).tolist() == [[0.0, 0.0], [0.0, 0.0]]
    with pytest.raises(ValueError, match="T must be a temperature above 0"):
        function([1.0, 0.0], 1.0, 0.0)


def test_any_name_of_a_chain_stays_a_comment():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], name='a """\nraise SystemExit\n""" b\\')
    assert numpy_function(closed_form(chain), "f")(0.01, 1.0) == pytest.approx(-1)


def test_fixed_temperature_and_parameters():
    form = closed_form(FIELD.fix(T="0.5", J=1))
    function = numpy_function(form, "f")
    assert function(0.3) == pytest.approx(float(solve(FIELD.at(T="0.5", J=1, h="0.3")).free_energy), rel=1e-14)
    with refuses(NotApplicable, "T, which is fixed"):
        numpy_function(form, "c")


def test_a_wrong_function_is_an_error(field, monkeypatch):
    value = numpy_check.Reference.value
    monkeypatch.setattr(numpy_check.Reference, "value", lambda self, point: value(self, point) * (1 + 1e-8))
    with refuses(SolveError, "gives", "but the formula", "Use solve(chain.at(…))"):
        numpy_function(field, "specific_heat")


def test_a_wrong_solver_is_an_error(field):
    with refuses(SolveError, "but the solver"):
        numpy_function(field, "f", solver=lambda point: solve(point.replace(J=float(point.number("J")) * 1.001)))


def test_refused(field):
    with refuses(ParameterError, "no NumPy function of 'heat'", "specific_heat"):
        numpy_function(field, "heat")
    with refuses(ParameterError, "Did you mean 'entropy'?"):
        numpy_function(field, "entrpy")
    with refuses(ParameterError, "no NumPy function of 'mean'", "mean(m)"):
        numpy_function(field, "mean")
    with refuses(ParameterError, "no observable 'x'"):
        numpy_function(field, "mean(x)")
    with refuses(NotApplicable, "not written by radicals", "use solve"):
        numpy_function(closed_form(models.load("spin1_nnn").chain.fix(h=0)), "f")
    renamed = Chain(ising(), [bond(lambda s, t, level: -level * s * t)])
    with refuses(NotApplicable, "a parameter called 'level'", "rename"):
        numpy_function(closed_form(renamed), "f")


def test_lengths_and_responses_of_next_nearest_neighbours():
    # Two quadratic blocks, one with complex eigenvalues where the couplings compete.
    chain = models.load("ising_nnn").chain.fix(h=0)
    form = closed_form(chain)
    for quantity in ("xi", "susceptibility(m)"):
        numpy_function(form, quantity, solver=solve)
    T = np.array([1.0, 0.2, 0.1])
    expected = np.asarray(solve(chain.at(T=T, J1=1, J2="-0.75")).correlation_length())
    assert numpy_function(form, "xi")(T, 1.0, -0.75) == pytest.approx(expected, rel=1e-9)


def test_response_that_grows_with_the_length(capel):
    function = numpy_function(capel, "susceptibility(m)", solver=solve)
    T = np.array([1.0, 0.2, 0.05])
    expected = np.asarray(solve(CAPEL.at(T=T, J=1, D="0.2")).susceptibility("m"))
    assert function(T, 1.0, 0.2) == pytest.approx(expected, rel=1e-9) and expected[-1] > 1e16


def test_sums_that_cancel_on_lines_of_equal_couplings():
    form = closed_form(
        Chain(spins("3/2"), [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)], {"q": lambda s: s * s})
    )
    function = numpy_function(form, "mean(q)")
    numbers = solve(form.chain.at(T=[0.01, 0.003, 0.001], J="0.3", D="0.3"))
    np.testing.assert_allclose(function([0.01, 0.003, 0.001], 0.3, 0.3), numbers.mean("q"), rtol=1e-10)


def test_a_weight_of_one():
    terms = [bond(lambda s, t, J: -J * s * t), weight(lambda s, g: g if s > 0 else 1, 0)]
    form = closed_form(Chain(ising(), terms, {"m": lambda s: s}))
    function = numpy_function(form, "susceptibility(m)")
    wanted = solve(form.chain.at(T="0.003", J=1, g=1)).susceptibility("m")
    assert function(0.003, 1.0, 1.0) == pytest.approx(float(wanted), rel=1e-9)


def test_degenerate_cubic_eigenvalues_are_refused():
    chain = Chain(
        StateSet(["o", "A", "B"]),
        [
            bond(lambda a, b: math.inf if {a, b} == {"A", "B"} else 0),
            site(lambda a, x, y: -x * (a == "A") - y * (a == "B")),
        ],
        {"A": lambda a: int(a == "A")},
    )
    with pytest.raises(SolveError, match=r"x=1, y=1, but the formula 0\.4999"):
        numpy_function(closed_form(chain), "mean(A)")
