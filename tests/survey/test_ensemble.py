"""Prescribed means and rate functions against the Ising chain in closed form and elementary chains."""

import mpmath
import numpy as np
import pytest

from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    bond,
    field_for_mean,
    ising,
    models,
    rate_function,
    site,
    solve,
    spins,
)

ISING = models.load("ising").chain


def ising_field(J, T, m, digits=60):
    """h from m = sinh L/√(sinh² L + e^{−4K}): E. Ising (1925), from memory."""
    with mpmath.workdps(digits):
        m, T = mpmath.mpf(m), mpmath.mpf(T)
        return T * mpmath.asinh(m * mpmath.exp(-2 * mpmath.mpf(J) / T) / mpmath.sqrt(1 - m * m))


def ising_rate(J, h, x):
    """Legendre transform of ln λ at T = 1, λ = e^K cosh L + √(e^{2K} sinh² L + e^{−2K}), Ising (1925), from memory."""
    with mpmath.workdps(90):
        K, L, x = (mpmath.mpf(number) for number in (J, h, x))

        def log_root(phi):
            field = L + phi
            return mpmath.log(
                mpmath.exp(K) * mpmath.cosh(field)
                + mpmath.sqrt(mpmath.exp(2 * K) * mpmath.sinh(field) ** 2 + mpmath.exp(-2 * K))
            )

        phi = ising_field(K, 1, x, 90) - L
        return phi * x - log_root(phi) + log_root(0)


# --- prescribed means


def test_the_field_of_a_published_magnetisation():
    # K = 0.5, L = 0.3: sinh L/√(sinh² L + e^{−4K}) = 0.6376526443593104961258298; Ising (1925), from memory.
    found = field_for_mean(ISING.fix(J="0.5", T=1), "m", "0.6376526443593104961258298", field="h")
    assert float(found.value) == pytest.approx(0.3, rel=1e-14)
    assert found.field == "h"
    assert float(solve(found.point).mean("m")) == pytest.approx(0.6376526443593105, rel=1e-14)


@pytest.mark.parametrize("mean", ["0.3", "-0.97", "1e-15", "0.999999999999999999999999"])
@pytest.mark.parametrize(("J", "T"), [("1", 1), ("-1", "0.1"), ("1", "0.05"), ("0.2", 30)])
def test_fields_of_the_ising_chain_to_the_last_digits(J, T, mean):
    found = field_for_mean(ISING.fix(J=J, T=T), "m", mean, field="h")
    wanted = float(ising_field(J, T, mean))
    assert float(found.value) == pytest.approx(wanted, rel=2e-12)
    assert abs(float(found.value) - wanted) <= float(found.error) + 1e-15 * abs(wanted)


def test_an_added_field_shifts_the_field_that_is_there():
    means = np.array([[-0.5, 0.0], [0.7, 0.9]])
    named = field_for_mean(ISING.fix(J="0.5", T=2), "m", means, field="h")
    added = field_for_mean(ISING.fix(J="0.5", T=2, h="0.3"), "m", means)
    assert added.interval == (-1, 1)
    assert added.value.shape == (2, 2)
    np.testing.assert_allclose(added.value + 0.3, named.value, atol=1e-13)
    np.testing.assert_allclose(solve(added.point).mean("m"), means, atol=1e-14)


def test_a_weight_is_adjusted_among_positive_values():
    helix = models.load("helix_coil").chain.fix(sigma="1e-4", T=1)
    found = field_for_mean(helix, "helicity", ["0.2", "0.5", "0.8"], field="s")
    assert found.value[1] == pytest.approx(1, rel=1e-12)  # the midpoint, by symmetry
    np.testing.assert_allclose(solve(found.point).mean("helicity"), [0.2, 0.5, 0.8], rtol=1e-12)


def test_a_bond_observable_and_a_pair_correlation():
    chain = Chain(ising(), [site(lambda s, h: -h * s)], {"e": bond(lambda s, t: s * t)})
    # At h = 0 an added field φ is an Ising coupling: ⟨s t⟩ = tanh φ/T.
    found = field_for_mean(chain.fix(h=0, T=2), "e", "0.4")
    assert float(found.value) == pytest.approx(2 * np.arctanh(0.4), rel=1e-13)


@pytest.mark.parametrize(
    ("mean", "text"),
    [
        ("0.6", r"mean 3/5 of density cannot be reached; allowed are means per cell strictly between 0 and 1/2"),
        ("1/2", r"mean 1/2 of density is reached only by an infinite field"),
    ],
)
def test_unreachable_means_name_the_interval(mean, text):
    gas = models.load("lattice_gas").chain.fix(mu=0, T=1)
    with pytest.raises(NotApplicable, match=text):
        field_for_mean(gas, "density", mean)


def test_a_named_field_that_cannot_do_it_tells_what_was_found():
    with pytest.raises(NotApplicable, match=r"means from 0 to 0\.5"):
        field_for_mean(models.load("lattice_gas").chain.fix(T=1), "density", "0.6", field="mu")


def test_a_constant_observable_cannot_be_moved():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], {"one": lambda s: 1})
    with pytest.raises(NotApplicable, match="one is 1 in every allowed configuration"):
        field_for_mean(chain.fix(J=1, T=1), "one", "0.5")


def test_a_jump_is_no_mean():
    # A bistable chain whose response at h = 0 is steeper than the numbers next to a coercive field of order 1.
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -(h - 1) * s)], {"m": lambda s: s})
    with pytest.raises(NotApplicable, match=r"no h that a double can hold.*passes from -1 to 1"):
        field_for_mean(chain.fix(J=1, T="0.02"), "m", "0.3", field="h")


def test_prescribed_means_refuse_bad_names():
    with pytest.raises(ParameterError, match="Did you mean 'h'"):
        field_for_mean(ISING.fix(J=1, T=1), "m", 0, field="H")
    with pytest.raises(ParameterError, match="no observable 'q'"):
        field_for_mean(ISING.fix(J=1, T=1), "q", 0, field="h")
    with pytest.raises(ParameterError, match="no value for T"):
        field_for_mean(ISING.fix(J=1), "m", 0, field="h")
    with pytest.raises(ParameterError, match="no value for h"):
        field_for_mean(ISING.fix(J=1, T=1), "m", 0)
    with pytest.raises(ParameterError, match="T is the temperature"):
        field_for_mean(ISING.fix(J=1, h=0), "m", 0, field="T")
    with pytest.raises(ParameterError, match="finite"):
        field_for_mean(ISING.fix(J=1, h=0, T=1), "m", float("inf"))


# --- rate functions


@pytest.mark.parametrize(("J", "h"), [("0.5", "0.3"), ("2", "0"), ("-3", "0.1")])
def test_rate_of_the_ising_chain_is_the_legendre_transform_of_its_root(J, h):
    values = ["-0.999999999999", "-0.5", "0.1", "0.6376526443", "0.63765264435931", "0.99999999999999"]
    found = rate_function(ISING.fix(J=J, h=h, T=1), "m", [float(x) for x in values])
    wanted = np.array([float(ising_rate(J, h, x)) for x in values])
    np.testing.assert_allclose(found.rate, wanted, rtol=1e-12)
    assert (np.abs(found.rate - wanted) <= found.error + 1e-15 * wanted).all()


def test_rate_at_the_ends_is_the_loss_of_all_other_configurations():
    # I(±1) = ln λ − K ∓ L at T = 1: only the saturated configuration is left.
    found = rate_function(ISING.fix(J=1, h="0.5", T=1), "m", [-1, 1])
    root = float(-solve(ISING.at(J=1, h="0.5", T=1)).free_energy)
    np.testing.assert_allclose(found.rate, [root - 0.5, root - 1.5], rtol=1e-12)
    assert found.field.tolist() == [-np.inf, np.inf]


def test_rate_of_free_spins_is_an_entropy():
    # Cramér's theorem for one toss: I(x) = ln 2 + Σ ½(1±x) ln ½(1±x), from memory.
    x = np.array([-1, -0.3, 0, 1e-8, 0.9, 1])
    found = rate_function(ISING.fix(J=0, h=0, T=3), "m", x)
    with mpmath.workdps(40):
        wanted = [
            float(
                mpmath.log(2) + sum((1 + s * y) / 2 * mpmath.log((1 + s * y) / 2) if s * y > -1 else 0 for s in (-1, 1))
            )
            for y in (mpmath.mpf(str(v)) for v in x)
        ]
    np.testing.assert_allclose(found.rate, wanted, rtol=1e-12, atol=1e-300)
    np.testing.assert_allclose(found.field[1:-1], 3 * np.arctanh(x[1:-1]), rtol=1e-12)


def test_beyond_the_possible_the_rate_is_infinite():
    found = rate_function(ISING.fix(J=1, h=0, T=1), "m", [-3, 2])
    assert np.isposinf(found.rate).all()
    assert found.interval == (-1, 1)


def test_rate_is_convex_with_slope_of_the_field_and_vanishes_at_the_mean():
    chain = models.load("blume_capel").chain.fix(J=1, D="0.4", h="0.2", T="0.7")
    mean = float(solve(chain.at()).mean("q"))
    x = np.linspace(0.05, 0.95, 19)
    found = rate_function(chain, "q", x)
    step = 1e-5
    beside = [rate_function(chain, "q", x + side * step).rate for side in (-1, 1)]
    np.testing.assert_allclose((beside[1] - beside[0]) / (2 * step), found.field / 0.7, rtol=1e-6, atol=1e-8)
    assert (np.diff(found.field) > 0).all()
    assert float(rate_function(chain, "q", mean).rate) < 1e-30


def test_rate_counts_hard_core_particles():
    # Number of ways to place xN particles, no two adjacent, on N sites: entropy (1−x) H(x/(1−x)); binomial, elementary.
    gas = models.load("lattice_gas").chain.fix(mu=0, T=1)
    x = np.array([0.1, 0.25, 0.4])
    y = x / (1 - x)
    entropy = -(1 - x) * (y * np.log(y) + (1 - y) * np.log(1 - y))
    golden = np.log((1 + np.sqrt(5)) / 2)
    found = rate_function(gas, "density", [*x, "0", "1/2"])
    np.testing.assert_allclose(found.rate[:3], golden - entropy, rtol=1e-12)
    np.testing.assert_allclose(found.rate[3:], golden, rtol=1e-12)


def test_rate_of_a_single_value_is_zero():
    chain = Chain(spins(1), [site(lambda s, D: D * s * s)], {"one": lambda s: 1})
    found = rate_function(chain.fix(D=1, T=1), "one", [1, 2])
    assert found.rate.tolist() == [0, np.inf]


def test_rate_function_refuses_bad_names():
    with pytest.raises(ParameterError, match="no observable 'M'"):
        rate_function(ISING.fix(J=1, h=0, T=1), "M", 0)
    with pytest.raises(ParameterError, match="no value for h, T"):
        rate_function(ISING.fix(J=1), "m", 0)
    with pytest.raises(ParameterError, match="takes a chain"):
        rate_function("ising", "m", 0)
