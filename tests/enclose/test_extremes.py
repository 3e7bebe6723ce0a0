"""Very low temperatures, near ties, exact zeros, and numbers too short for what is asked."""

from fractions import Fraction

import mpmath
import pytest

from tests.enclose.arithmetics import HAVE_FLINT, NAMES, use
from tests.laws.zoo import BY_NAME
from tmsolve import Chain, NotApplicable, StateSet, bond, certify, colours, ising, models, site, spins

ISING = BY_NAME["ising"].chain
GAS = BY_NAME["lattice_gas"].chain
SPIN1 = BY_NAME["blume_capel"].chain


@pytest.fixture(params=NAMES, autouse=True)
def arithmetic(request, monkeypatch):
    use(request.param, monkeypatch)
    return request.param


def test_ising_at_a_millionth(arithmetic):
    certificate = certify(ISING.at(T="1e-6", J=1, h="0.3"), digits=60)
    with mpmath.workdps(120):
        assert certificate.contains(-mpmath.mpf("1.3"))  # the next term is of the order of 10^(-2000000)
    assert certificate.digits >= 60


def test_hard_core_at_a_millionth(arithmetic):
    # λ² = λ + z for particles that exclude their neighbours, z = e^{μ/T}: the matrix [[1, √z], [√z, 0]].
    certificate = certify(GAS.at(T="1e-6", mu=1), digits=40)
    with mpmath.workdps(120):
        z = mpmath.exp(mpmath.mpf(10) ** 6)
        assert certificate.contains(-mpmath.mpf("1e-6") * mpmath.log((1 + mpmath.sqrt(1 + 4 * z)) / 2))
    assert certificate.certified and str(certificate) == f"-0.5{41 * '0'}(1)"


def test_residual_entropy_at_the_critical_field(arithmetic):
    # Antiferromagnet at h = 2|J|, f → −|J| − T ln φ: M. Brooks and C. Domb, Proc. R. Soc. A 207, 343 (1951).
    certificate = certify(ISING.at(T="1e-8", J=-1, h=2), digits=40)
    with mpmath.workdps(90):
        assert certificate.contains(-1 - mpmath.mpf("1e-8") * mpmath.log(mpmath.phi))


def test_exact_ties_and_near_ties_are_told_apart(arithmetic):
    tie = certify(ISING.at(T="1e-20", J="-0.3", h="0.6"), digits=30)
    near = certify(ISING.at(T="1e-20", J=-(0.1 * 3), h="0.6"), digits=30)
    with mpmath.workdps(90):
        assert tie.contains(-mpmath.mpf("0.3") - mpmath.mpf("1e-20") * mpmath.log(mpmath.phi))
    # The float 0.1*3 is 0.30000000000000004: the field loses against that exchange, and no entropy is left.
    assert near.contains("-0.30000000000000004")
    assert not tie.free_energy.overlaps(near.free_energy)


def test_a_decorated_diamond_at_a_millionth(arithmetic):
    animal = BY_NAME["diamond"]
    values = {"T": "1e-6", "J1": "-1", "J2": "-0.8", "h": "0"}
    certificate = certify(animal.chain.at(**values), digits=40)
    half = Fraction(1, 2)
    with mpmath.workprec(400):

        def weight(n, m):
            total = mpmath.mpf(0)
            for a in (-half, half):
                for b in (-half, half):
                    energy = (n + m) * (a + b) + Fraction(4, 5) * a * b
                    total += mpmath.exp(-mpmath.mpf(energy.numerator) / energy.denominator * 10**6)
            return total

        # Symmetric under reversal of all spins: λ is the sum of a row.
        value = -mpmath.mpf("1e-6") * mpmath.log(weight(half, half) + weight(half, -half))
    assert certificate.contains(value) and certificate.certified


def test_tiny_free_energies_are_given_to_relative_precision(arithmetic):
    # Ground state energy 0, one empty level at +1: f = −T ln(1 + e^{−1/T}).
    chain = Chain(colours(2), [site(lambda s, E: E * s)])
    certificate = certify(chain.at(T="0.01", E=1))
    with mpmath.workdps(150):
        assert certificate.contains(-mpmath.log1p(mpmath.exp(-100)) / 100)
    assert certificate.certified and str(certificate).endswith("e-46")


def test_what_the_numbers_are_too_short_for_is_bounded_and_said(arithmetic):
    chain = Chain(colours(2), [site(lambda s, E: E * s)])
    certificate = certify(chain.at(T="1e-6", E=1), bits=512)
    assert not certificate.certified and certificate.digits == 0 and certificate.bits == 512
    assert certificate.free_energy.lower <= 0 and certificate.free_energy.upper - certificate.free_energy.lower < 1e-100
    assert "not certified to 30 digits: no digit with 512 bits" in str(certificate)
    assert str(certificate).startswith("0 ± ")


def test_a_free_energy_that_vanishes(arithmetic):
    one = certify(Chain(StateSet([0]), [site(lambda s: s)]).at(T=1))
    assert one.free_energy.lower == one.free_energy.upper == 0 and one.certified and str(one) == "0"
    half = certify(Chain(StateSet([0, 1], weights=["1/3", "2/3"]), [site(lambda s: 0)]).at(T=1), bits=300)
    assert half.contains(0) and not half.certified


def test_classes_that_never_mix_are_all_taken_into_account(arithmetic):
    inf = float("inf")
    chain = Chain(
        spins(1), [bond(lambda s, t, J: -J if s == t else (inf if 0 in (s, t) else 0)), site(lambda s, D: D * (s == 0))]
    )
    with mpmath.workdps(90):
        pair = certify(chain.at(T=1, J=1, D=0))  # {−1, 1}: λ = e + 1; {0}: e
        assert pair.contains(-mpmath.log(mpmath.e + 1))
        lone = certify(chain.at(T=1, J=1, D=-1))  # {0}: e²
        assert lone.contains(-2)
        tie = certify(Chain(ising(), [bond(lambda s, t: 0 if s == t else inf)], name="walls").at(T=1))
        assert tie.contains(0)


@pytest.mark.parametrize("temperature", ["0.005", "0.0003", "0.0000002"])
def test_two_ground_states_of_which_one_has_entropy(temperature, arithmetic):
    # Energy −2 per step: alternating 0 2 0 2 …, or 1 and 3 with no two 3s in a row, which has the entropy ln φ. The
    # weights of the two in the Perron vector differ by a factor like exp(−600), or far less.
    rows = [[3, 1, -2, 3], [1, -2, 3, -2], [-2, 3, 2, 3], [3, -2, 3, -1]]
    certificate = certify(Chain(colours(4), [bond(lambda s, t: rows[s][t])]).at(T=temperature), digits=40)
    with mpmath.workdps(90):
        assert certificate.contains(-2 - mpmath.mpf(temperature) * mpmath.log(mpmath.phi))
    assert certificate.certified


def test_the_spectrum_needs_flint(arithmetic):
    certificate = certify(SPIN1.at(T=1, J=1, D="0.5", h=0))
    if arithmetic == "balls":
        assert len(certificate.spectrum) == 3 and certificate.spectrum is certificate.spectrum
    else:
        from tmsolve.errors import MissingExtra

        with pytest.raises(MissingExtra, match=r"flint is not installed.*tmsolve\[certified\]"):
            certificate.spectrum


@pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint")
def test_both_arithmetics_agree(arithmetic, monkeypatch):
    point = SPIN1.at(T="0.4", J=1, D="0.9", h="0.01")
    first = certify(point)
    use("rounding", monkeypatch)
    second = certify(point)
    assert "mpmath" in second.method and first.free_energy.overlaps(second.free_energy)


@pytest.mark.parametrize("name", models.names())
def test_shipped_models(name, arithmetic):
    model = models.load(name)
    values = {**model.defaults}
    if any(states.grid is not None for states in model.chain.cell.values()):
        with pytest.raises(NotApplicable, match="a certificate has an exact answer, and continuous states have none"):
            certify(model.chain.at(**{"T": "0.7", **values}))
        return
    certificate = certify(model.chain.at(**{"T": "0.7", **values}))
    assert certificate.certified
