"""Entropy changes, isentropes and activation slopes against elementary chains and Maxwell's relation."""

import mpmath
import numpy as np
import pytest

from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    StateSet,
    adiabatic_slope,
    bond,
    entropy_change,
    isentrope,
    ising,
    local_slope,
    models,
    site,
    solve,
    spins,
)

ISING = models.load("ising").chain
FREE = ISING.fix(J=0)


def free_spins(S):
    """Spins without coupling in a field h: their thermodynamics is Brillouin's, L. Brillouin (1927), from memory."""
    return Chain(spins(S), [site(lambda s, h: -h * s)], {"m": lambda s: s})


def brillouin_entropy(S, x):
    """s(x) = ln Z − x ∂ ln Z/∂x with Z = sinh((2S+1)x/2)/sinh(x/2), x = h/T."""
    n = 2 * mpmath.mpf(S) + 1
    if x == 0:
        return mpmath.log(n)
    mean = (n * mpmath.coth(n * x / 2) - mpmath.coth(x / 2)) / 2
    return mpmath.log(mpmath.sinh(n * x / 2) / mpmath.sinh(x / 2)) - x * mean


# --- entropy changes


@pytest.mark.parametrize("S", ["1/2", "1", "7/2"])
def test_entropy_change_of_free_spins_is_brillouins(S):
    T = np.array([0.3, 1.0, 40.0])
    found = entropy_change(free_spins(S), T=T, start="0.1", stop=2)
    with mpmath.workdps(40):
        spin = mpmath.mpf(S.split("/")[0]) / (2 if "/" in S else 1)
        steps = [
            brillouin_entropy(spin, 2 / mpmath.mpf(str(t)))
            - brillouin_entropy(spin, mpmath.mpf("0.1") / mpmath.mpf(str(t)))
            for t in T
        ]
    np.testing.assert_allclose(found.value, [float(step) for step in steps], rtol=1e-12)


def test_entropy_change_is_relatively_accurate_where_the_entropies_nearly_agree():
    # −x²/2 + x⁴/4 − x⁶/9 for a free spin ±1 at x = h/T, from its series.
    found = entropy_change(FREE, T=[1e3, 1e9], start=0, stop=1)
    np.testing.assert_allclose(found.value, [-0.5e-6 + 0.25e-12 - 1e-18 / 9, -0.5e-18], rtol=1e-14)
    assert (found.error < 1e-14 * np.abs(found.value)).all()


def test_entropy_change_is_zero_by_symmetry_and_without_change():
    assert entropy_change(ISING.fix(J=1), T=1, start=-1, stop=1).value == 0
    assert entropy_change(ISING.fix(J=1), T=1, start=1, stop=1).value == 0


@pytest.mark.parametrize(("J", "T"), [(1, "0.5"), (-1, "0.3"), ("0.4", 2)])
def test_entropy_change_is_the_integral_of_maxwells_relation(J, T):
    chain = ISING.fix(J=J)
    nodes, weights = np.polynomial.legendre.leggauss(80)
    # The response is as narrow as T exp(−2J/T): h = width sinh u spreads the nodes evenly over its scales.
    width = float(T) * np.exp(-2 * max(float(J), 0) / float(T))
    end = np.arcsinh(2.5 / width)
    u = end * (1 + nodes) / 2
    rate = solve(chain.at(T=T, h=width * np.sinh(u))).derivative("T", of="mean(m)")
    integral = float(weights @ (rate * width * np.cosh(u))) * end / 2
    assert float(entropy_change(chain, T=T, start=0, stop="2.5").value) == pytest.approx(integral, rel=1e-11)


def test_entropy_changes_broadcast():
    found = entropy_change(ISING.fix(J=1), T=np.array([0.5, 1.0])[:, None], start=0, stop=[1.0, 2.0, 3.0])
    assert found.value.shape == found.error.shape == (2, 3)
    alone = entropy_change(ISING.fix(J=1), T=1, start=0, stop=3)
    assert found.value[1, 2] == pytest.approx(float(alone.value), rel=1e-14)


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        ({"field": "H"}, "Did you mean 'h'"),
        ({"field": "T"}, "T is the temperature"),
        ({"field": "J"}, "'J' is fixed"),
    ],
)
def test_entropy_change_refuses_what_is_no_field(arguments, text):
    with pytest.raises(ParameterError, match=text):
        entropy_change(ISING.fix(J=1), T=1, start=0, stop=1, **arguments)


def test_entropy_change_asks_for_what_is_missing():
    with pytest.raises(ParameterError, match=r"no value for J.*chain\.fix\(J=…\)"):
        entropy_change(ISING, T=1, start=0, stop=1)
    with pytest.raises(ParameterError, match="T is fixed in this chain"):
        entropy_change(ISING.fix(J=1, T=1), T=1, start=0, stop=1)
    with pytest.raises(ParameterError, match="takes a chain, got 3"):
        entropy_change(3, T=1, start=0, stop=1)
    with pytest.raises(ParameterError, match="do not broadcast"):
        entropy_change(FREE, T=1, start=[0, 1], stop=[0, 1, 2])


# --- isentropes


def test_free_spins_keep_the_ratio_of_temperature_and_field():
    fields = np.array([4.0, 1.0, 1e-3, 7.0])
    found = isentrope(free_spins(2), values=fields, T0=2, at=4)
    np.testing.assert_allclose(found.T, fields / 2, rtol=1e-13)
    np.testing.assert_allclose(found.slope, 0.5, rtol=1e-12)
    assert (np.abs(found.T - fields / 2) <= found.error).all()


def test_close_to_saturation_long_numbers_tell_the_temperature():
    found = isentrope(FREE, values=[2, 1, "0.1"], T0=100000, at=4)
    np.testing.assert_allclose(found.T, [50000, 25000, 2500], rtol=1e-14)
    assert (found.error < 1e-14 * found.T).all()


@pytest.mark.parametrize("J", [1, -1])
def test_entropy_is_constant_along_an_isentrope_and_its_slope_is_the_tangent(J):
    chain = ISING.fix(J=J)
    fields = np.linspace(0.3, 1.5, 5)
    line = isentrope(chain, values=fields, T0="0.8", at="0.7")
    np.testing.assert_allclose(solve(chain.at(T=line.T, h=fields)).entropy, line.entropy, rtol=1e-12)
    step = 1e-4
    beside = [isentrope(chain, values=fields + side * step, T0="0.8", at="0.7").T for side in (-1, 1)]
    np.testing.assert_allclose((beside[1] - beside[0]) / (2 * step), line.slope, rtol=1e-6)


def test_at_the_start_an_isentrope_has_the_temperature_of_the_start():
    found = isentrope(ISING.fix(J=1), values="0.4", T0="0.7", at="0.4")
    assert found.T.shape == ()
    assert float(found.T) == pytest.approx(0.7, rel=1e-14)


def test_an_isentrope_that_ends_at_zero_temperature_says_so():
    with pytest.raises(NotApplicable, match=r"h=0 has the entropy .* down to T = 0"):
        isentrope(FREE, values=[1, 0], T0=1, at=1)
    # At h = 2|J| the antiferromagnet keeps ln((1+√5)/2) = 0.481 at T = 0.
    with pytest.raises(NotApplicable, match="no temperature at h=2 "):
        isentrope(ISING.fix(J=-1), values=[1, 2], T0="0.3", at="2.5")


def test_an_isentrope_needs_entropy_and_a_single_start():
    with pytest.raises(NotApplicable, match="nothing is left to follow"):
        isentrope(ISING.fix(J=1), values=[1], T0="0.002", at=2)
    with pytest.raises(ParameterError, match="starts at a single point"):
        isentrope(FREE, values=[1], T0=[1, 2], at=1)
    with pytest.raises(ParameterError, match="Did you mean 'h'"):
        isentrope(FREE, values=[1], T0=1, at=1, field="H")


# --- slopes


def test_adiabatic_slope_of_free_spins_is_the_ratio_of_temperature_and_field():
    T = np.array([0.2, 1.0, 5.0])
    np.testing.assert_allclose(adiabatic_slope(solve(free_spins(1).at(T=T, h=2)), "h"), T / 2, rtol=1e-12)


def test_adiabatic_slope_takes_long_numbers():
    slope = adiabatic_slope(solve(FREE.at(T=3, h=7), digits=30), "h")
    assert mpmath.almosteq(slope, mpmath.mpf(3) / 7, rel_eps=1e-15)


def test_adiabatic_slope_refuses_a_frozen_chain_and_strange_names():
    still = Chain(StateSet([0]), [site(lambda s, h: -h * s)])
    with pytest.raises(NotApplicable, match="entropy does not depend on T"):
        adiabatic_slope(solve(still.at(T=1, h=1)), "h")
    with pytest.raises(ParameterError, match="Did you mean 'h'"):
        adiabatic_slope(solve(FREE.at(T=1, h=1)), "H")
    with pytest.raises(ParameterError, match="T is what follows"):
        adiabatic_slope(solve(FREE.at(T=1, h=1)), "T")
    with pytest.raises(ParameterError, match=r"make one with solve"):
        adiabatic_slope(FREE, "h")


@pytest.mark.parametrize("J", ["1", "-1", "0.3"])
def test_local_slope_of_the_ising_chain_is_twice_the_coupling(J):
    # Tχ = exp(2J/T) at h = 0: M. E. Fisher, J. Math. Phys. 4, 124 (1963), from memory.
    slope = local_slope(solve(ISING.fix(J=J, h=0).at(T=[0.02, 0.3, 1, 30])), "m")
    np.testing.assert_allclose(slope, 2 * float(J), rtol=1e-10)


def test_local_slope_and_growth_of_the_correlation_length_meet_at_low_temperature():
    T = 0.05
    low, high = (solve(ISING.at(T=t, J=1, h=0)) for t in (T, T * 1.0001))
    rate = np.log(low.correlation_length() / high.correlation_length()) / (1 / low.point.T - 1 / high.point.T)
    assert float(local_slope(low)) == pytest.approx(float(rate), rel=1e-9)


@pytest.mark.parametrize("D", ["0.2", "0.6"])
def test_local_slope_of_spin_one_tends_to_the_wall_through_zero(D):
    # Energies of the walls by counting bonds: up, 0, down costs 2J − D; up, down costs 2J.
    chain = models.load("blume_capel").chain.fix(J=1, D=D, h=0)
    assert float(local_slope(solve(chain.at(T="0.01")))) == pytest.approx(2 - float(D), rel=1e-6)


def test_local_slope_is_the_derivative_of_the_logarithm():
    chain = models.load("blume_capel").chain.fix(J=1, D="0.9", h="0.1")
    beta = np.array([1.25 - 1e-4, 1.25 + 1e-4])
    logs = np.log(solve(chain.at(T=1 / beta)).temperature_susceptibility("m"))
    slope = float(local_slope(solve(chain.at(T="0.8"))))
    assert slope == pytest.approx((logs[1] - logs[0]) / 2e-4, rel=1e-7)


def test_local_slope_refuses_what_does_not_fluctuate():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], {"one": lambda s: 1})
    with pytest.raises(NotApplicable, match="χT of one is 0"):
        local_slope(solve(chain.at(T=1, J=1)), "one")
    with pytest.raises(ParameterError, match="no observable 'M'"):
        local_slope(solve(ISING.at(T=1, J=1, h=0)), "M")
