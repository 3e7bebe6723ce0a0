"""Both arithmetics of long numbers give the digits asked for, and say which one it was."""

import mpmath
import pytest

from tests.laws.zoo import BY_NAME, NAMES
from tmsolve import Chain, SolveError, bond, models, site, solve, spins
from tmsolve.answer import classes, long
from tmsolve.operators import midpoints

DIGITS = 40
#: A susceptibility that vanishes exactly comes out as the square of some rounding.
NOTHING = mpmath.mpf("1e-100")


def without_flint(monkeypatch):
    monkeypatch.setattr(midpoints, "flint_module", lambda: None)
    monkeypatch.setattr(classes, "flint_module", lambda: None)


def readings(chain, values):
    solution = solve(chain.at(**values), digits=DIGITS)
    found = [solution.free_energy, solution.entropy, solution.specific_heat]
    found += [solution.susceptibility(name) for name in chain.observables]
    # A mean is known absolutely: the difference of probabilities may vanish.
    means = [solution.mean(name) for name in chain.observables]
    return solution.diagnostics, [*found, *(1 + mean for mean in means)]


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("T", [None, "1/30"])
def test_they_agree_over_the_zoo(name, T, monkeypatch):
    pytest.importorskip("flint")
    animal = BY_NAME[name]
    values = dict(animal.values) if T is None else {**animal.values, "T": T}
    facts, fast = readings(animal.chain, values)
    assert facts["arithmetic"] == "python-flint"
    without_flint(monkeypatch)
    facts, slow = readings(animal.chain, values)
    assert facts["arithmetic"] == "mpmath"
    with mpmath.workdps(DIGITS + 20):
        for a, b in zip(fast, slow, strict=True):
            assert abs(a - b) <= max(abs(b), NOTHING) * mpmath.mpf(10) ** (1 - DIGITS)


def test_the_exact_answer(monkeypatch):
    """Zero-field Ising chain: T·χ = exp(2J/T), f = −T ln 2cosh(J/T)."""
    chain = models.load("ising").chain
    for remove in (lambda patch: None, without_flint):
        remove(monkeypatch)
        solution = solve(chain.at(T="1/100", J=1, h=0), digits=DIGITS)
        with mpmath.workdps(DIGITS + 20):
            exact = mpmath.exp(200), -mpmath.log(2 * mpmath.cosh(100)) / 100
            found = solution.temperature_susceptibility("m"), solution.free_energy
            for a, b in zip(found, exact, strict=True):
                assert abs(a - b) <= max(abs(b), NOTHING) * mpmath.mpf(10) ** (1 - DIGITS)


def test_doubles_are_called_doubles():
    facts = solve(models.load("ising").chain.at(T=[1.0, 1e-3], J=1, h=0)).diagnostics
    assert facts["arithmetic"].tolist()[0] == "doubles"
    assert facts["arithmetic"].tolist()[1] in ("mpmath", "python-flint")


def test_settings_are_restored_by_a_solve():
    flint = pytest.importorskip("flint")
    before = flint.ctx.prec
    solve(models.load("ising").chain.at(T="1e-3", J=1, h=0), digits=100)
    assert flint.ctx.prec == before


def test_an_error_inside_leaves_the_settings():
    flint = pytest.importorskip("flint")
    before = flint.ctx.prec
    chain = Chain(spins("1/2"), [site(lambda s, J: -J * s * s), bond(lambda s, t: 0 if s == t else float("inf"))])
    with pytest.raises(SolveError, match="never mix"):
        solve(chain.at(T=1, J=1), digits=30)
    assert flint.ctx.prec == before


CHAIN_49 = Chain(
    spins(3), [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2)], {"m": lambda s: s}
)


def test_a_large_matrix_climbs_with_flint_only(monkeypatch):
    point = CHAIN_49.at(T="0.02", J=1, K="0.3")
    # Two ferromagnetic ground states: −J s² − K s² at s = ±3.
    pytest.importorskip("flint")
    assert long.climb_limit() == 100
    solution = solve(point)
    assert solution.diagnostics["arithmetic"] == "python-flint"
    assert solution.free_energy == pytest.approx(-9 * 1.3, rel=1e-14)
    without_flint(monkeypatch)
    with pytest.raises(
        SolveError, match=r'more than 40 states .*up to 100 with python-flint: .*"tmsolve\[certified\]"'
    ):
        solve(point)


def test_digits_of_a_large_matrix_name_the_extra(monkeypatch):
    without_flint(monkeypatch)
    with pytest.raises(Exception, match=r"limited to 40 joint states of the cut \(up to 100 with python-flint"):
        solve(CHAIN_49.at(T=1, J=1, K="0.3"), digits=20)
    with pytest.raises(Exception, match=r"T = 0 for up to 40 joint states of the cut \(up to 100 with python-flint"):
        solve(CHAIN_49.at(T=0, J=1, K="0.3"))
