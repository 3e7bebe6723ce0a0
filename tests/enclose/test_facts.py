"""Certified digits against values that others published."""

import mpmath
import pytest

from tests.enclose.arithmetics import HAVE_FLINT, NAMES, use
from tmsolve import Chain, StateSet, bond, certify, colours, delta, ising, site, spins

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
POTTS = Chain(colours(3), [bond(lambda s, t, J: -J * delta(s, t)), site(lambda s, h: -h * delta(s, 0))])
SPIN1 = Chain(spins(1), [bond(lambda s, t, J, K: -J * s * t - K * s * s * t * t), site(lambda s, D: D * s * s)])
# Ising chain in zero field, ln λ = ln(2 cosh K) at K = 1: E. Ising, Z. Phys. 31, 253 (1925).
A01 = "1.12692801104297249644372680636"
# Ising chain in a field, K = 0.5, L = 0.3: H. A. Kramers and G. H. Wannier, Phys. Rev. 60, 252 (1941).
A02 = ("2.510842662858650628671619", "0.9361010237939868098289908")
# Potts chain in a field, q = 3, K = 0.7, L = 0.4: Z. Glumac and K. Uzelac, J. Phys. A 27, 7709 (1994), from memory.
B06 = ("4.736290362190538495249236", "1.281628369226371138433721", "1.013752707470476521624549")
# Blume–Capel chain, J = 1, D = 0.5, T = 1: formula of M. Suzuki, B. Tsujiyama, S. Katsura, J. Math. Phys. 8, 124
# (1967), from memory.
C01 = ("2.620447791534908643512118", "1.42559111055169831791537", "0.2514036393136493322698137")
# Blume–Emery–Griffiths chain, J = 1, K = 0.5, D = 0.8, T = 0.6: the same formula.
C02 = ("3.533886925516472880584855", "3.096711699160873023193773", "0.7919424616297755812491103")
FACTS = {
    "A01": (ISING.at(T=1, J=1, h=0), None),
    "A02": (ISING.at(T=1, J="0.5", h="0.3"), A02),
    "B06": (POTTS.at(T=1, J="0.7", h="0.4"), B06),
    "C01": (SPIN1.at(T=1, J=1, K=0, D="0.5"), C01),
    "C02": (SPIN1.at(T="0.6", J=1, K="0.5", D="0.8"), C02),
}


def printed(text):
    """The interval of numbers that a printed decimal may stand for."""
    places = len(text.partition(".")[2])
    with mpmath.workdps(60):
        half = mpmath.mpf(10) ** -places / 2
        return mpmath.mpf(text) - half, mpmath.mpf(text) + half


def inside(enclosure, text):
    low, high = printed(text)
    return low <= mpmath.mpf(enclosure.lower.numerator) / enclosure.lower.denominator and (
        mpmath.mpf(enclosure.upper.numerator) / enclosure.upper.denominator <= high
    )


@pytest.mark.parametrize("arithmetic", NAMES)
@pytest.mark.parametrize("name", FACTS)
def test_the_free_energy_agrees_with_every_digit_published(name, arithmetic, monkeypatch):
    use(arithmetic, monkeypatch)
    point, values = FACTS[name]
    certificate = certify(point)
    assert certificate.certified and certificate.exact_input and certificate.digits >= 30
    with mpmath.workdps(60):
        if values is None:
            assert inside(certificate.log_eigenvalue, A01)
        else:
            low, high = (mpmath.log(x) for x in printed(values[0]))
            log = certificate.log_eigenvalue
            assert low <= mpmath.mpf(log.lower.numerator) / log.lower.denominator
            assert mpmath.mpf(log.upper.numerator) / log.upper.denominator <= high
    assert certificate.free_energy == certificate.log_eigenvalue.times(-point.values["T"])


@pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint")
@pytest.mark.parametrize("name", [name for name in FACTS if name != "A01"])
def test_the_spectrum_agrees_with_every_digit_published(name):
    point, values = FACTS[name]
    balls = certify(point).spectrum
    assert [ball.multiplicity for ball in balls] == [1] * len(values)
    with mpmath.workdps(60):
        for ball, value in zip(balls, values, strict=True):
            assert inside(ball.real, value)
            assert ball.imag.lower == ball.imag.upper == 0


@pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint")
def test_degenerate_eigenvalues_share_a_ball():
    chain = Chain(colours(5), [bond(lambda s, t, J: -J * delta(s, t))])
    first, rest = certify(chain.at(T=1, J=1)).spectrum
    assert (first.multiplicity, rest.multiplicity) == (1, 4)
    with mpmath.workdps(80):
        assert first.contains(mpmath.e + 4) and rest.contains(mpmath.e - 1)  # R. B. Potts (1952), from memory
    assert rest.real.radius < 1e-30 and "multiplicity 4" in str(rest)


@pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint")
def test_complex_pairs_are_mirror_images():
    # A clockwise preference on three colours: eigenvalues of a circulant matrix, a textbook formula.
    chain = Chain(colours(3), [bond(lambda s, t, J: -J if (t - s) % 3 == 1 else 0)])
    balls = certify(chain.at(T=1, J=1)).spectrum
    with mpmath.workdps(80):
        turn = mpmath.expjpi(mpmath.mpf(2) / 3)
        values = [mpmath.e + 2, 1 + mpmath.e * turn + turn**2, 1 + mpmath.e / turn + turn**-2]
        for value in values:
            assert sum(ball.contains(value) for ball in balls) == 1
    assert len(balls) == 3 and balls[0].imag.radius == 0 < balls[1].imag.radius


@pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint")
def test_states_that_no_cycle_visits_have_eigenvalue_zero():
    forbidden = float("inf")
    chain = Chain(colours(3), [bond(lambda s, t: 0 if t >= s and t > 0 else forbidden)])
    balls = certify(chain.at(T=1)).spectrum
    assert [(ball.multiplicity, ball.contains(1), ball.contains(0)) for ball in balls] == [
        (2, True, False),
        (1, False, True),
    ]
    assert str(balls[-1]) == "0"


@pytest.mark.parametrize("arithmetic", NAMES)
def test_state_weights_and_words_count_exactly(arithmetic, monkeypatch):
    use(arithmetic, monkeypatch)
    chain = Chain(StateSet(["low", "high"], weights=[1, 3]), [site(lambda s, E: E if s == "high" else 0)])
    certificate = certify(chain.at(T=2, E=1), digits=40)
    with mpmath.workdps(90):
        assert certificate.contains(-2 * mpmath.log(1 + 3 * mpmath.exp(-mpmath.mpf(1) / 2)))
    assert certificate.size == 1 and certificate.digits >= 40
