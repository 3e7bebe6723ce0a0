"""Averages over random products: against enumeration, closed forms, quadrature; seeds; what is refused."""

import numpy as np
import pytest
from scipy import stats

from tests.disorder.outside import NORMAL_BONDS, RANDOM_FIELD, SIGNED_BONDS, open_realisation
from tests.refusal import refused
from tmsolve import Chain, StateSet, bond, ising, models, site, solve, spins, weight
from tmsolve.disorder.averages import Average
from tmsolve.disorder.quenched import quenched
from tmsolve.disorder.stationary import stationary_message
from tmsolve.errors import DeclarationError, NotApplicable, ParameterError, SolveError

FIELD = models.load("random_field_ising").chain
BOND = models.load("random_bond_ising").chain


def agrees(average, value, bars=4.5):
    assert average.error > 0
    assert abs(average.value - value) < bars * average.error, (average, value)


# --- one realisation


def test_an_open_realisation_of_random_bonds_is_the_sum_over_its_bonds():
    bonds = np.random.default_rng(4).normal(0.3, 1.0, 400)
    found = quenched(BOND.fix(T="0.7", h=0), {"J": bonds}, cells=400)
    assert found.replicas == 1 and found.free_energy.error == 0
    log_z = np.log(2) + np.log(2 * np.cosh(bonds / 0.7)).sum()
    # ln Z of the chain with both ends free; the message starts from the mean over the first spin.
    assert np.log(2) - 400 * found.free_energy.value / 0.7 == pytest.approx(log_z, rel=1e-13)
    assert found.internal_energy.value == pytest.approx(-(bonds * np.tanh(bonds / 0.7)).mean(), rel=1e-12)


def test_every_derivative_of_a_realisation_is_that_of_the_sum_over_configurations():
    bonds, fields = [0.9, -0.4, 1.3, 0.2, -1.1], [0.5, -0.7, 0.1, 1.2, -0.3]
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h, H: -(h + H) * s)],
        observables={"m": lambda s: s},
    )
    found = quenched(
        chain.fix(T="0.8", H=0), {"J": bonds, "h": fields}, cells=5, derivatives=[("T", "H"), ("H", "H")]
    )
    wanted = open_realisation(bonds, fields, "0.8")
    got = {
        "f": found.free_energy, "s": found.entropy, "c": found.specific_heat, "m": found.mean("m"),
        "chi": found.susceptibility("m"), "f_TH": found.derivative("T", "H"),
    }  # fmt: skip
    for name, average in got.items():
        assert 5 * average.value == pytest.approx(wanted[name], rel=1e-11), name
    assert found.derivative("H").value == pytest.approx(-found.mean("m").value, rel=1e-12)
    assert found.derivative("H", "H").value == pytest.approx(-found.susceptibility("m").value, rel=1e-12)
    assert found.derivative("T").value == -found.entropy.value
    assert found.derivative("h").value == pytest.approx(-found.mean("m").value, rel=1e-12)
    assert found.derivative("T", "T").value == pytest.approx(-found.specific_heat.value / 0.8, rel=1e-12)


def test_energies_and_weights_that_take_the_temperature_have_their_derivatives():
    chain = Chain(
        spins(1),
        [
            bond(lambda s, t, J, T: -J * (1 + T / 3) * s * t),
            site(lambda s, D: D * s * s),
            weight(lambda s, T: 1 + T * T * s * s),
        ],
        observables={"m": lambda s: s},
    )
    found = quenched(chain.fix(T="0.9", D="0.4"), {"J": [0.7] * 60}, cells=60)
    longer = quenched(chain.fix(T="0.9", D="0.4"), {"J": [0.7] * 120}, cells=120)
    pure = solve(chain.at(T="0.9", D="0.4", J="0.7"))
    for name in ("free_energy", "internal_energy", "entropy", "specific_heat"):
        # The end counts alike in both lengths.
        bulk = 2 * getattr(longer, name).value - getattr(found, name).value
        assert bulk == pytest.approx(float(getattr(pure, name)), rel=1e-10), name


def test_lists_are_read_cell_by_cell_and_copy_by_copy():
    cell = {"a": ising(), "b": ising()}
    inner = bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0)
    chain = Chain(cell, [inner, bond(lambda s, t, J: -J * s * t, ("b", "a"))])
    given = [0.3, 1.7, -0.4, 0.9, 2.0, -1.0]
    found = quenched(chain.fix(T=1), {"J": given}, cells=3)
    assert -3 * found.free_energy.value == pytest.approx(np.log(2 * np.cosh(given)).sum(), rel=1e-13)


# --- averages


def test_random_fields_against_quadrature_with_little_noise_left():
    found = quenched(FIELD.fix(T=1, J=1, H=0), {"h": stats.norm(0, 1)}, cells=80, rng=11)
    agrees(found.free_energy, -RANDOM_FIELD["growth"])
    agrees(found.internal_energy, RANDOM_FIELD["u"])
    agrees(found.specific_heat, RANDOM_FIELD["c"])
    agrees(found.susceptibility("m"), RANDOM_FIELD["chi"])
    agrees(found.mean("m"), 0)
    agrees(found.entropy, RANDOM_FIELD["growth"] + RANDOM_FIELD["u"])
    plain = found.samples().std(ddof=1) / np.sqrt(found.replicas)
    assert (plain / found.free_energy.error) ** 2 > 1000
    energies = found.samples("internal_energy").std(ddof=1) / np.sqrt(found.replicas)
    assert (energies / found.internal_energy.error) ** 2 > 1000


def test_magnetisation_in_a_uniform_field():
    found = quenched(FIELD.fix(T=1, J=1, H="0.3"), {"h": "normal(0,1)"}, cells=40, replicas=96, rng=2)
    agrees(found.mean("m"), RANDOM_FIELD["m_at_0.3"])
    shifted = quenched(FIELD.fix(T=1, J=1, H=0), {"h": "normal(0.3,1)"}, cells=40, replicas=96, rng=2)
    assert shifted.free_energy.value == pytest.approx(found.free_energy.value, abs=1e-5)
    agrees(Average(-shifted.derivative("h").value, shifted.derivative("h").error), RANDOM_FIELD["m_at_0.3"])


@pytest.mark.parametrize("H", ["1", "1.75"])
def test_nearly_saturated_chains(H):
    """Where rare fields decide, what is fitted to usual ones must not be trusted; exact: the integral equation."""
    chain, law = FIELD.fix(T="1/2", J=1, H=H), {"h": "normal(0,0.5)"}
    exact = stationary_message(chain, law)
    for seed in range(2):
        found = quenched(chain, law, cells=150, replicas=32, rng=seed)
        for read in (lambda r: r.free_energy, lambda r: r.mean("m"), lambda r: r.specific_heat):
            assert abs(read(found).value - read(exact).value) < 5 * read(found).error
        assert found.free_energy.error < 1e-3


def test_without_control_variates_the_average_is_the_plain_one():
    found = quenched(FIELD.fix(T=1, J=1, H=0), {"h": "normal(0,1)"}, cells=300, rng=3, control_variates=False)
    agrees(found.free_energy, -RANDOM_FIELD["growth"])
    assert found.free_energy.value == pytest.approx(found.samples().mean(), rel=1e-14)
    assert not found.control_variates


def test_normal_bonds_and_their_variance():
    found = quenched(BOND.fix(T=1, h=0), {"J": "normal(0,1)"}, cells=400, replicas=200, rng=5, control_variates=False)
    agrees(found.free_energy, -NORMAL_BONDS["growth"])
    agrees(found.internal_energy, NORMAL_BONDS["u"])
    nodes, weights = np.polynomial.hermite_e.hermegauss(120)
    logs = np.log(2 * np.cosh(nodes))
    variance = weights @ (logs - NORMAL_BONDS["growth"]) ** 2 / weights.sum()
    measured = found.samples().var(ddof=1) * 400
    assert measured == pytest.approx(variance, rel=4.5 * np.sqrt(2 / 199))


def test_far_tails_of_normal_bonds_are_not_cut_off():
    """<ln 2cosh J> over N(1, 0.7): integrated by mpmath with 30 digits. Nothing is left to average: bars are tiny."""
    found = quenched(BOND.fix(T=1, h=0), {"J": "normal(1,0.7)"}, cells=200, replicas=16, rng=5)
    assert found.free_energy.value == pytest.approx(-1.23883140268898946117, rel=1e-14)
    assert found.free_energy.error < 1e-13


def test_a_list_says_how_many_cells_there_are():
    found = quenched(FIELD.fix(T=1, J=1, H=0), {"h": [0.1, -0.2, 0.3]})
    assert found.cells == 3 and found.replicas == 1


def test_signed_bonds():
    found = quenched(BOND.fix(T=1, h=0), {"J": {"0.8": "0.7", "-0.8": "0.3"}}, cells=100, replicas=32, rng=6)
    assert found.free_energy.value == pytest.approx(-SIGNED_BONDS["growth"], rel=1e-13)
    assert found.free_energy.error < 1e-13
    agrees(found.susceptibility("m"), SIGNED_BONDS["chi"])


def test_several_random_parameters_each_with_a_law_of_its_own():
    laws = {"J": "uniform(0.5,1.5)", "h": {-1: 0.5, 1: 0.5}}
    with_controls = quenched(FIELD.fix(T=1, H=0), laws, cells=30, rng=8)
    without = quenched(FIELD.fix(T=1, H=0), laws, cells=400, replicas=128, rng=9, control_variates=False)
    for name in ("free_energy", "internal_energy"):
        one, other = getattr(with_controls, name), getattr(without, name)
        assert abs(one.value - other.value) < 4.5 * np.hypot(one.error, other.error)
        assert one.error < other.error / 3


def test_longer_bonds_and_more_states():
    chain = Chain(
        spins(1),
        [bond(lambda s, t, J: -J * s * t, shift=2), site(lambda s, D, h: D * s * s - h * s)],
        observables={"m": lambda s: s, "q": lambda s: s * s},
    )
    two = quenched(chain.fix(T=1, J=1, D="0.3"), {"h": "normal(0,0.5)"}, cells=20, replicas=8, rng=1)
    near = Chain(chain.cell, [bond(lambda s, t, J: -J * s * t), chain.terms[1]], observables=chain.observables)
    one = quenched(near.fix(T=1, J=1, D="0.3"), {"h": "normal(0,0.5)"}, cells=40, replicas=16, rng=2)
    # Two interleaved chains are two chains.
    for read in (lambda r: r.free_energy, lambda r: r.mean("q"), lambda r: r.susceptibility("m", "q")):
        assert abs(read(one).value - read(two).value) < 4.5 * np.hypot(read(one).error, read(two).error)


def test_pairs_of_many_observables_are_carried_when_asked_for():
    observables = {"a": lambda s: s, "b": lambda s: s * s, "c": lambda s: 2 * s, "d": lambda s: 1 - s}
    chain = Chain(spins(1), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables=observables)
    law = {"h": "uniform(0,1)"}
    plain = quenched(chain.fix(T=1, J=1), law, cells=5, replicas=2, rng=1)
    refused(NotApplicable, lambda: plain.susceptibility("a", "c"), "a and c", "derivatives=")
    pairs = [("a", "c"), ("d", "a")]
    # Other controls, and so other estimates, belong to other pairs: the sums themselves are compared.
    asked = quenched(chain.fix(T=1, J=1), law, cells=5, replicas=2, rng=1, derivatives=pairs, control_variates=False)
    assert asked.susceptibility("a", "c").value == pytest.approx(2 * asked.susceptibility("a").value, rel=1e-9)
    assert asked.susceptibility("a", "d").value == pytest.approx(-asked.susceptibility("a").value, rel=1e-9)


# --- exponents


def test_exponents_of_a_pure_chain_are_its_eigenvalues():
    found = quenched(BOND.fix(T=1, h=0), {"J": {1: 1}}, cells=40, replicas=2, rng=0)
    assert found.lyapunov(1).value == pytest.approx(np.log(2 * np.cosh(1)), rel=1e-12)
    assert found.lyapunov(2).value == pytest.approx(np.log(2 * np.sinh(1)), rel=1e-12)
    assert found.correlation_length().value == pytest.approx(float(solve(BOND.at(T=1, h=0, J=1)).correlation_length()))


def test_exponents_of_random_bonds():
    found = quenched(BOND.fix(T=1, h=0), {"J": "normal(1,0.3)"}, cells=100, replicas=32, rng=1)
    rng = np.random.default_rng(0)
    gap = -np.log(np.abs(np.tanh(rng.normal(1, 0.3, 10**6)))).mean()
    length = found.correlation_length()
    assert abs(1 / length.value - gap) < 5 * length.error * gap**2 + 2e-3
    agrees(found.lyapunov(1), float(-found.free_energy.value), bars=5)


# --- seeds


def test_the_same_seed_gives_the_same_numbers():
    def run(rng):
        found = quenched(FIELD.fix(T=1, J=1, H=0), {"h": "normal(0,1)"}, cells=20, replicas=4, rng=rng)
        return found.free_energy, found.susceptibility("m"), found.seed

    assert run(5) == run(5) == run(np.int64(5))
    assert run(5)[0] != run(6)[0]
    assert run(np.random.default_rng(1)) == run(np.random.default_rng(1))
    first, again = run(None), run(None)
    assert first[0] != again[0] and run(first[2])[0] == first[0]


def test_a_result_prints_what_it_knows():
    text = str(quenched(FIELD.fix(T=1, J=1, H=0), {"h": "normal(0,1)"}, cells=20, replicas=4, rng=5))
    for word in ("4 replicas of 20 cells", "seed 5", "free_energy", "susceptibility(m)"):
        assert word in text
    assert str(Average(-1.23456, 0.0123)) == "-1.235(12)" and str(Average(123.4, 15.0)) == "123(15)"
    assert str(Average(0.5, 0.0)) == "0.5"


def test_exponents_of_three_states_are_eigenvalues_where_nothing_is_random():
    chain = models.load("blume_capel").chain.fix(T=1, J=1, D="0.4")
    found = quenched(chain, {"h": {"0.3": 1}}, cells=60, replicas=2, rng=3)
    spins_of = np.array([-1, 0, 1])
    local = np.exp(0.3 * spins_of - 0.4 * spins_of**2)
    values = np.sort(np.abs(np.linalg.eigvals(np.exp(np.outer(spins_of, spins_of)) * local)))[::-1]
    for k, value in enumerate(values, 1):
        assert found.lyapunov(k).value == pytest.approx(np.log(value), rel=1e-3 if k > 1 else 1e-9)


def test_exponents_far_below_the_first_keep_their_digits():
    found = quenched(FIELD.fix(T="0.1", J=1, H=0), {"h": "normal(3,0.3)"}, cells=50, replicas=16, rng=1)
    # All spins are up: ln Z per cell is (h + J)/T, and ln |det| is 2J/T.
    agrees(found.correlation_length(), 0.1 / (2 * (3 + 1) - 2))


def test_an_exponent_that_a_product_of_smaller_rank_lacks_is_refused():
    chain = Chain(spins(1), [bond(lambda s, t, J: -J * s * s * t * t), site(lambda s, h: -h * s)])
    found = quenched(chain.fix(T=1, J=1), LAW, cells=30, replicas=4, rng=1)
    assert found.lyapunov(2).value < found.lyapunov(1).value
    refused(NotApplicable, lambda: found.lyapunov(3), "no exponent 3", "smaller rank")
    free = quenched(Chain(ising(), [site(lambda s, h: -h * s)]).fix(T=1), LAW, cells=5, replicas=2, rng=1)
    assert free.correlation_length().value == 0


# --- what is refused

FIXED = FIELD.fix(T=1, J=1, H=0)
LAW = {"h": "normal(0,1)"}


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda: quenched(FIELD.fix(J=1, H=0), LAW), ParameterError, ["temperature is not fixed", "chain.fix(T=…)"]),
        (lambda: quenched(FIELD.fix(J=1, H=0, T=0), LAW), NotApplicable, ["T = 0", "disordered_ground_state"]),
        (lambda: quenched(FIELD.fix(T=1, H=0), LAW), ParameterError, ["no value for J"]),
        (lambda: quenched("ising", LAW), DeclarationError, ["'ising'", "a chain"]),
        (lambda: quenched(FIXED, {}), DeclarationError, ["random=", "{}"]),
        (lambda: quenched(FIXED, ["h"]), DeclarationError, ["random=", "['h']"]),
        (lambda: quenched(FIXED, {"hh": "normal(0,1)"}), ParameterError, ["'hh'", "Did you mean 'h'?"]),
        (lambda: quenched(FIXED, {"T": "normal(1,0.1)"}), ParameterError, ["temperature cannot be random"]),
        (lambda: quenched(FIXED, {"J": "normal(0,1)"}), ParameterError, ["'J' is fixed", "before fix(…)"]),
        (lambda: quenched(FIXED, LAW, cells=0), ParameterError, ["cells= is a whole number >= 1, got 0"]),
        (lambda: quenched(FIXED, LAW, cells=2.5), ParameterError, ["got 2.5"]),
        (lambda: quenched(FIXED, LAW, replicas=-3), ParameterError, ["replicas= is a whole number >= 1, got -3"]),
        (lambda: quenched(FIXED, LAW, replicas=1), ParameterError, ["at least 2 replicas, got 1"]),
        (lambda: quenched(FIXED, LAW, rng=-1), ParameterError, ["a seed, a whole number >= 0", "got -1"]),
        (lambda: quenched(FIXED, LAW, rng="x"), ParameterError, ["numpy.random.Generator", "got 'x'"]),
        (lambda: quenched(FIXED, LAW, rng=True), ParameterError, ["got True"]),
        (lambda: quenched(FIXED, {"h": [1, 2]}, cells=3), DeclarationError, ["2 values", "need 3", "leave cells= out"]),
        (lambda: quenched(FIXED, {"h": [1, 2]}, cells=1), DeclarationError, ["'h' has 2 values", "1 cells need 1"]),
        (lambda: quenched(FIXED, {"h": stats.norm(0, -1)}), DeclarationError, ["'h'", "out of range"]),
        (lambda: quenched(FIXED, {"h": "normal(0,1e300)"}), DeclarationError, ["1e50", "larger unit"]),
        (lambda: quenched(FIXED, {"h": [1, 2]}, cells=2, replicas=5), ParameterError, ["realisation", "replicas=5"]),
        (lambda: quenched(FIXED, {"h": stats.cauchy()}), DeclarationError, ["mean"]),
        (lambda: quenched(FIXED, {"h": {0: 0.5}}), DeclarationError, ["sum to 0.5"]),
        (lambda: quenched(FIXED, LAW, cells=2, derivatives=["J"]), ParameterError, ["pairs of names", "'J'"]),
        (lambda: quenched(FIXED, LAW, cells=2, derivatives=[("J", "x")]), ParameterError, ["'x'"]),
    ],
)
def test_unusable_input(act, error, fragments):
    refused(error, act, *fragments)


def test_what_a_result_does_not_know():
    found = quenched(FIXED, LAW, cells=5, replicas=2, rng=1)
    refused(ParameterError, lambda: found.mean("q"), "'q'", "m")
    refused(ParameterError, lambda: found.derivative("x"), "'x'", "T")
    refused(ParameterError, lambda: found.derivative("T", "T", "T"), "got 3")
    refused(NotApplicable, lambda: found.derivative("J", "H"), "J and H", "derivatives=")
    refused(ParameterError, lambda: found.lyapunov(3), "1 to 2", "got 3")
    refused(ParameterError, lambda: found.lyapunov(0), "got 0")
    refused(ParameterError, lambda: found.samples("entropy"), "'entropy'")


def test_observables_that_take_a_random_parameter_are_left_out_by_name():
    chain = Chain(
        ising(), [site(lambda s, h: -h * s)], observables={"m": lambda s: s, "aligned": lambda s, h: h * s}
    )
    found = quenched(chain.fix(T=1), LAW, cells=5, replicas=2, rng=1)
    refused(ParameterError, lambda: found.mean("aligned"), "'aligned'", "free of random parameters")


def test_a_realisation_without_any_configuration_is_reported():
    chain = Chain(StateSet([0, 1]), [weight(lambda s, c: 1 if c * s > 2 else 0)])
    law = {"c": {1: 0.5, 2: 0.5}}
    refused(SolveError, lambda: quenched(chain.fix(T=1), law, cells=5, replicas=2, rng=1), "no configuration at all")


def test_a_parameter_without_a_derivative_is_only_missed_when_asked_for():
    dilute = models.load("diluted_blume_capel").chain.fix(T=1, J=1, D=0, h=0)
    found = quenched(dilute, {"c": {0: "0.3", 1: "0.7"}}, cells=20, replicas=4, rng=1)
    assert found.free_energy.value < 0
    refused(NotApplicable, lambda: found.derivative("c"), "'c'", "no derivative", "probability_derivative('c'")


def test_messages_that_do_not_forget_their_end_are_remarked_on():
    pair = Chain(StateSet([0, 1]), [weight(lambda s, t, c: c if s != t else 0, 0, 1)])
    found = quenched(pair.fix(T=1), {"c": {1: 0.5, 2: 0.5}}, cells=10, replicas=2, rng=1)
    assert "averages may depend on the end" in found.notes[0]
