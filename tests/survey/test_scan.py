"""The verb scan: values, order of axes, failures, refusals."""

import math

import numpy as np
import pytest

from tests.refusal import refused
from tests.survey.chains import BLUME_CAPEL, FROZEN, ISING, WARM, small_blocks
from tmsolve import ParameterError, SolveError, axis, scan, solve


def test_readings_agree_with_ising_1925():
    """f = −T ln 2cosh(J/T), ξ = −1/ln tanh(J/T), T·χ = exp(2J/T). E. Ising, Z. Phys. 31, 253 (1925)."""
    read = ["free_energy", "correlation_length", "temperature_susceptibility(m)"]
    grid = scan(ISING, {"T": axis("T", "0.5", 3, 6), "J": [0.5, 1.0]}, read)
    K = grid["J"] / grid["T"][:, None]
    assert grid["free_energy"] == pytest.approx(-grid["T"][:, None] * np.log(2 * np.cosh(K)), rel=1e-13)
    assert grid["correlation_length"] == pytest.approx(-1 / np.log(np.tanh(K)), rel=1e-12)
    assert grid["temperature_susceptibility(m)"] == pytest.approx(np.exp(2 * K), rel=1e-12)


def test_axes_keep_their_order_and_blocks_their_place(monkeypatch):
    small_blocks(monkeypatch, 7)
    h, T = np.linspace(-1, 1, 11), np.linspace(0.5, 2, 9)
    grid = scan(ISING.fix(J=1), {"h": h, "T": T}, ["mean(m)"])
    assert grid.dims == ("h", "T") and grid.shape == (11, 9)
    alone = [[float(solve(ISING.at(J=1, h=a, T=b)).mean("m")) for b in T] for a in h]
    assert grid["mean(m)"] == pytest.approx(np.array(alone), rel=1e-13, abs=1e-15)


def test_a_callable_is_a_reading():
    def wilson(solution):
        return solution.temperature_susceptibility("m") / solution.specific_heat

    grid = scan(ISING.fix(J=1), {"T": [1, 2]}, [wilson, "specific_heat"])
    expected = np.exp(2 / grid["T"]) / ((1 / grid["T"]) ** 2 / np.cosh(1 / grid["T"]) ** 2)
    assert grid["wilson"] == pytest.approx(expected, rel=1e-12)
    assert grid.units["wilson"] == ""


def test_a_single_reading_needs_no_list():
    assert scan(ISING.fix(J=1), {"T": [1, 2]}, "entropy")["entropy"].shape == (2,)


def test_units_and_symbols_come_with_the_readings():
    grid = scan(ISING, {"T": [1, 2], "J": [1]}, ["specific_heat", "susceptibility(m)", "mean(m)"])
    assert dict(grid.units) == {
        "T": "energy", "J": "", "specific_heat": "k_B", "susceptibility(m)": "1/energy", "mean(m)": "1",
    }  # fmt: skip
    assert grid.symbols["specific_heat"] == "c"


def test_points_that_fail_are_masked_and_the_others_kept():
    grid = scan(FROZEN.fix(T=1), {"mu": axis("mu", -1, 1, 5)}, ["mean(n)", "free_energy"])
    assert grid["mean(n)"].tolist()[:2] == [0.0, 0.0] and grid["mean(n)"].tolist()[3:] == [1.0, 1.0]
    assert np.isnan(grid["mean(n)"][2]) and np.isnan(grid["free_energy"][2])
    assert grid.mask.tolist() == [False, False, True, False, False]
    (failure,) = grid.failed
    index, coordinates, message = failure
    assert index == (2,) and coordinates == {"mu": 0.0} and "tie in free energy" in message


def test_temperature_zero_fails_where_it_is_and_nowhere_else():
    grid = scan(WARM.fix(J=1, D=0), {"T": axis("T", 0, 1, 3), "h": [0, 1]}, ["entropy"])
    assert [f.index for f in grid.failed] == [(0, 0), (0, 1)]
    assert "no ground state" in grid.failed[0].message
    assert np.isfinite(grid["entropy"][1:]).all()


def test_a_reading_that_fails_does_not_take_the_others_with_it():
    def picky(solution):
        if (np.asarray(solution.point.T) > 1.4).any():
            raise ZeroDivisionError("no such luck")
        return solution.entropy

    grid = scan(ISING.fix(J=1), {"T": axis("T", 1, 2, 11)}, [picky, "entropy"])
    assert np.isfinite(grid["entropy"]).all()
    assert np.isfinite(grid["picky"]).tolist() == [True] * 5 + [False] * 6
    assert {f.message for f in grid.failed} == {"picky: ZeroDivisionError: no such luck"}
    assert grid.mask.tolist() == [False] * 5 + [True] * 6


def test_a_reading_that_gives_nan_is_a_failure():
    def root(solution):
        with np.errstate(invalid="ignore"):
            return np.sqrt(solution.mean("m"))

    grid = scan(ISING.fix(J=1, T=1), {"h": [-1, 1]}, [root])
    assert grid.failed[0].message == "root: it returned NaN" and len(grid.failed) == 1


def test_infinite_readings_are_no_failures():
    grid = scan(FROZEN.fix(T=1), {"mu": [0.5, 1.0]}, ["correlation_length", lambda_inf])
    assert not grid.failed and np.isinf(grid["lambda_inf"]).all()


def lambda_inf(solution):
    """A reading that is infinite everywhere."""
    return np.full(solution.shape, math.inf)


def test_a_grid_knows_where_it_came_from():
    grid = scan(BLUME_CAPEL.fix(J="0.1"), {"T": [1, 2], "D": [0.5]}, ["entropy"])
    attrs = grid.attrs
    assert attrs["chain"] == "Blume-Capel" and attrs["parameters"] == {"h": "0", "J": "0.1"}
    assert attrs["software"].keys() == {"tmsolve", "numpy", "python"}
    assert attrs["states"] == {"s": ["-1", "0", "1"]} and len(attrs["terms"]) == 2
    assert "k_B = 1" in attrs["conventions"] and attrs["complete"] is True


def test_the_time_is_left_out_for_reproducible_files(monkeypatch):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "0")
    assert "time" not in scan(ISING.fix(J=1), {"T": [1, 2]}, ["entropy"]).attrs
    monkeypatch.delenv("SOURCE_DATE_EPOCH")
    assert scan(ISING.fix(J=1), {"T": [1, 2]}, ["entropy"]).attrs["time"].endswith("+00:00")


CHAIN = ISING.fix(J=1)
AXES = {"T": [1, 2]}


@pytest.mark.parametrize(
    ("arguments", "fragments"),
    [
        ((CHAIN, AXES, ["specific_heta"]), ("specific_heta", "Did you mean 'specific_heat'?")),
        ((CHAIN, AXES, ["mean(M)"]), ("'M'", "m")),
        ((CHAIN, AXES, ["mean"]), ("mean", "observable")),
        ((CHAIN, AXES, []), ("read is empty",)),
        ((CHAIN, AXES, 5), ("read takes a list", "5")),
        ((CHAIN, AXES, [5]), ("5",)),
        ((CHAIN, AXES, ["entropy", "entropy"]), ("two readings", "'entropy'")),
        ((CHAIN, {"T": [1, 2], "H": [1, 2]}, ["entropy"]), ("'H'", "Did you mean 'h'?")),
        ((CHAIN, {"T": [1, 2], "J": [1, 2]}, ["entropy"]), ("'J'", "fixed at 1")),
        ((ISING, AXES, ["entropy"]), ("no value for J", "chain.fix(J=…)")),
        ((CHAIN, {"h": [1, 2]}, ["entropy"]), ("no value for T", "chain.fix(T=…)")),
        ((CHAIN, {}, ["entropy"]), ("axes is empty", "solve(chain.at(…))")),
        ((CHAIN, [1, 2], ["entropy"]), ("axes takes a mapping", "[1, 2]")),
        ((CHAIN, {"T": 1}, ["entropy"]), ("single value 1", "chain.fix(T=…)")),
        ((CHAIN, {"T": [[1, 2]]}, ["entropy"]), ("'T'", "one-dimensional", "(1, 2)")),
        ((CHAIN, {"T": [1, -2]}, ["entropy"]), ("T", "-2.0")),
        ((CHAIN, {"T": [1, math.nan]}, ["entropy"]), ("'T'", "NaN")),
        ((CHAIN, {"T": []}, ["entropy"]), ("'T'", "empty")),
        ((CHAIN, {"T": axis("h", 0, 1, 3)}, ["entropy"]), ("axis made for 'h'", "'T'")),
        ((CHAIN.at(T=1), AXES, ["entropy"]), ("scan takes a chain", "Point")),
        ((CHAIN, AXES, [lambda s: 1.0]), ("<lambda>", "one real number per point")),
        ((CHAIN, AXES, [lambda s: s.nothing]), ("<lambda>", "AttributeError", "every point it was tried")),
        ((CHAIN, AXES, [lambda s: s.entropy, lambda s: s.entropy]), ("two readings are called '<lambda>'",)),
    ],
    ids=lambda value: "" if isinstance(value, tuple) and len(value) == 3 else str(value),
)
def test_what_concerns_the_whole_scan_is_refused_before_anything_is_computed(arguments, fragments):
    called = []
    refused(ParameterError, lambda: scan(*arguments, progress=lambda *a: called.append(a)), *fragments)
    assert not called


def test_a_reading_may_not_be_called_like_an_axis():
    def T(solution):
        return solution.entropy

    refused(ParameterError, lambda: scan(CHAIN, AXES, [T]), "'T'", "like an axis")


def test_an_executor_must_be_one():
    refused(ParameterError, lambda: scan(CHAIN, AXES, ["entropy"], executor=4), "Executor", "ThreadPoolExecutor", "4")


def test_solve_error_is_not_hidden_when_every_point_fails():
    grid = scan(FROZEN.fix(mu=0), {"T": [1, 2]}, ["entropy"])
    assert len(grid.failed) == 2 and np.isnan(grid["entropy"]).all()
    with pytest.raises(SolveError):
        solve(FROZEN.at(mu=0, T=1))
