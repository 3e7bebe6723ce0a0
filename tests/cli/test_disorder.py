"""``tmsolve disorder``: output, the numbers of the library, what is refused."""

import math

import pytest

from tmsolve import models
from tmsolve.cli.phrases import for_command_line
from tmsolve.disorder.ground_energy import disordered_ground_state
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message

FIELD = ("disorder", "random_field_ising", "--random", "h=normal(0,1)")
FEW = ("--cells", "20", "--replicas", "4", "--seed", "3")


def test_the_command_prints_the_averages_of_the_library(tm):
    ended = tm(*FIELD, *FEW, "-p", "T=0.8")
    chain = models.load("random_field_ising").chain.fix(T="0.8", J=1, H=0)
    expected = quenched(chain, {"h": "normal(0,1)"}, cells=20, replicas=4, rng=3)
    assert ended.code == 0 and ended.err == ""
    averages = (expected.free_energy, expected.mean("m"), expected.susceptibility("m"), expected.correlation_length())
    assert all(str(average) in ended.out for average in averages)
    assert "free_energy" in ended.out and "1/energy" in ended.out
    for line in ("h ~ normal(0,1)", "4 replicas of 20 cells, seed 3", "T = 0.8", "J = 1  (default)"):
        assert line in ended.out


def test_json_holds_values_and_errors(tm):
    names = ["free_energy", "derivative(J)", "derivative(J,H)", "lyapunov(2)"]
    read = ",".join(names)
    document = tm(*FIELD, *FEW, "--json", "--read", read).json
    assert list(document["results"]) == names
    assert document["results"]["free_energy"]["error"] > 0
    assert document["units"] == {
        "free_energy": "energy",
        "derivative(J)": "",
        "derivative(J,H)": "",
        "lyapunov(2)": "1",
    }
    assert document["random"] == {"h": "normal(0,1)"} and document["seed"] == 3 and document["method"] == "sample"
    again = tm(*FIELD, *FEW, "--json", "--read", read).json
    assert again == document


def test_glass_susceptibility_and_correlations_of_signed_bonds(tm):
    """K01: (1 + t²)/(1 − t²) and (1 − 2p) t at K = 0.8; Fischer and Hertz, Spin Glasses (1991), from memory."""
    words = ("disorder", "random_bond_ising", "-p", "T=1", "-p", "h=0", "--random", "J=choice(0.8:0.7,-0.8:0.3)", *FEW)
    found = tm(*words, "--json", "--read", "glass_susceptibility(m),correlation(m,m,1)").json["results"]
    assert found["glass_susceptibility(m)"]["value"] == pytest.approx(2.5774644711948851061, rel=1e-12)
    near = found["correlation(m,m,1)"]
    assert abs(near["value"] - 0.4 * math.tanh(0.8)) < 6 * near["error"]
    refused = tm(*words, "--read", "correlation(m,m,far)")
    assert refused.code == 2 and "two observables and a whole number of cells" in refused.err
    other = tm(*words[:8], "--method", "exact", "--read", "glass_susceptibility(m)")
    assert other.code == 1 and "take --method sample" in other.err


def test_exact_and_annealed_averages(tm):
    exact = tm(*FIELD, "--method", "exact", "--json", "--read", "free_energy,average_correlation_length").json
    chain = models.load("random_field_ising").chain.fix(T=1, J=1, H=0)
    expected = stationary_message(chain, {"h": "normal(0,1)"})
    assert exact["results"]["free_energy"]["value"] == expected.free_energy.value
    annealed = tm(*FIELD, "--method", "annealed", "--json").json
    assert annealed["results"]["free_energy"]["value"] < expected.free_energy.value
    assert annealed["results"]["free_energy"]["error"] == 0
    part = tm(*FIELD, "--method", "annealed", "--read", "free_energy,lyapunov(1)")
    assert part.code == 3 and "lyapunov" in part.err and "; take --method sample" in part.err
    sampled = tm(*FIELD, *FEW, "--json", "--read", "average_correlation_length").json
    value = exact["results"]["average_correlation_length"]["value"]
    assert sampled["results"]["average_correlation_length"]["value"] == pytest.approx(value, rel=1e-2)


def test_zero_temperature(tm):
    words = ("disorder", "random_field_ising", "--random", "h=choice(-0.8:1/2,0.8:1/2)", "-p", "T=0", *FEW)
    document = tm(*words, "--json").json
    assert document["results"]["energy"] == {"value": -37 / 30, "error": 0.0, "exact": "-37/30"}
    chain = models.load("random_field_ising").chain.fix(J=1, H=0)
    expected = disordered_ground_state(chain, {"h": {"-0.8": "1/2", "0.8": "1/2"}}, cells=20, replicas=4, rng=3)
    assert document["results"]["residual_entropy"]["value"] == expected.residual_entropy.value
    assert "-37/30" in tm(*words).out
    sampled = tm(*FIELD, "-p", "T=0", *FEW, "--json").json
    assert sampled["results"]["energy"]["exact"] is None and sampled["results"]["energy"]["error"] > 0


@pytest.mark.parametrize(
    ("words", "fragments"),
    [
        (("disorder", "ising"), ["no random parameter", "--random"]),
        ((*FIELD, "--random", "h=uniform(0,1)"), ["given twice"]),
        (("disorder", "ising", "--random", "hh=normal(0,1)"), ["--random hh", "Did you mean 'h'?"]),
        (("disorder", "ising", "--random", "h=gauss(0,1)"), ["--random h:", "normal(MEAN,DEVIATION)"]),
        (("disorder", "ising", "--random", "h=choice(1:0.5,2:0.4)"), ["sum to 0.9"]),
        (("disorder", "ising", "--random", "h=choice(1:-1/2,2:3/2)"), ["probability of 1 must be", "got -0.5"]),
        (("disorder", "ising", "--random", "h=choice(1:1/3,2:1/2)"), ["sum to 0.833333", "got {1: 1/3, 2: 1/2}"]),
        (("disorder", "ising", "--random", "h=normal(0,1),J=normal(0,1)"), ["Every random parameter has its own"]),
        (("disorder", "ising", "--random", "h=fields.csv"), ["--realisation fields.csv, with a column h"]),
        (("disorder", "ising", "--random", "h=0.3"), ["normal(MEAN,DEVIATION)", "in all cells: -p h=0.5"]),
        (
            ("disorder", "ising", "--random", "h=normal(1e400,1)"),
            ["--random h:", "'normal(1e400,1)'", "beyond 1e50"],
        ),
        (("disorder", "ising", "--random", "h=normal(0,-1)"), ["deviation of 'normal(0,-1)' must be > 0"]),
        (("disorder", "ising", "--random", "h=normal(0,inf)"), ["'inf' in 'normal(0,inf)' is not a number"]),
        (("disorder", "ising", "--random", "h=choice(-1,1)"), ["pairs every value with its probability"]),
        ((*FIELD, "-p", "h=1"), ["h is random"]),
        ((*FIELD, "--cells", "0"), ["--cells"]),
        ((*FIELD, "--replicas", "1"), ["--replicas"]),
        ((*FIELD, "--seed", "-2"), ["--seed"]),
        ((*FIELD, "--method", "guess"), ["sample, exact, annealed", "'guess'"]),
        ((*FIELD, "--read", "entropi"), ["Did you mean 'entropy'?"]),
        ((*FIELD, "--read", "mean"), ["mean takes 1 names"]),
        ((*FIELD, "--read", "lyapunov(x)"), ["whole number k"]),
        ((*FIELD, "--method", "exakt"), ["Did you mean 'exact'?"]),
        ((*FIELD, "-p", "T=0", "--read", "entropy"), ["no average at T = 0 'entropy'", "residual_entropy"]),
        ((*FIELD, "-p", "T=0", "--method", "exact"), ["leave --method out"]),
        ((*FIELD, "-p", "T=0", "--read", "domains"), ["domains takes 1 names"]),
        ((*FIELD, "-p", "T=0", "--longest", "0"), ["--longest must be a whole number >= 1"]),
        ((*FIELD, "-p", "T=0", "--longest", "3", "--read", "energy"), ["--longest belongs to domains(a)"]),
        ((*FIELD, "--longest", "3"), ["--longest belongs to -p T=0"]),
        ((*FIELD, "--seed", "1.5"), ["--seed must be a whole number >= 0, got '1.5'"]),
        ((*FIELD, "--seed", "one"), ["--seed must be a whole number >= 0, got 'one'"]),
        ((*FIELD, "--cells", ""), ["--cells must be a whole number >= 1, got ''"]),
        (("disorder", "ising", "--random", "T=normal(1,0.1)"), ["one temperature holds for the whole chain"]),
    ],
)
def test_what_is_refused(tm, words, fragments):
    ended = tm(*words)
    assert ended.code == 2
    for fragment in fragments:
        assert fragment in ended.err


def test_a_mean_below_rounding_is_zero(tm):
    words = ("disorder", "diluted_blume_capel", "--random", "c=choice(0:0.1,1:0.9)", *FEW, "--read", "mean(m),mean(q)")
    document = tm(*words, "--json").json
    assert 0 < abs(document["results"]["mean(m)"]["value"]) < 1e-15
    (row,) = [line.split() for line in tm(*words).out.splitlines() if line.startswith("mean(m)")]
    assert row == ["mean(m)", "0", "1"]


def test_advice_is_in_the_words_of_the_command_line(tm):
    moved = "the equation moved by 1e-05, not by less than 1e-11; give a larger tolerance, or use quenched(…)"
    assert for_command_line(moved) == "the equation moved by 1e-05, not by less than 1e-11; take --method sample"
    ended = tm("disorder", "blume_capel", "--random", "h=normal(0,1)", "--method", "exact")
    assert ended.code == 1 and "has 3 states" in ended.err and "take --method sample" in ended.err
