"""Enclosures contain the number they are about and shrink with the digits asked for."""

import math
from fractions import Fraction

import mpmath
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.enclose.arithmetics import HAVE_FLINT, NAMES, use
from tests.laws.reference import Reference
from tests.laws.strategies import random_chains
from tests.laws.zoo import NAMES as ZOO_NAMES
from tests.laws.zoo import ZOO
from tmsolve import Chain, bond, certify, colours, solve
from tmsolve.enclose.bracket import Bracket
from tmsolve.errors import SolveError


class Table:
    """Bond energies by a table."""

    __name__ = "table"

    def __init__(self, entries):
        self.entries = entries

    def __call__(self, s, t):
        return self.entries[s][t]


ENERGIES = st.builds(Fraction, st.integers(-12, 12), st.sampled_from([1, 2, 3, 4, 8]))
TEMPERATURES = st.sampled_from([Fraction(1, 60), Fraction(1, 20), Fraction(1, 7), 1, 10, 100])


@st.composite
def matrices(draw):
    """Draw a small square table of energies with some configurations forbidden, and a temperature."""
    n = draw(st.integers(2, 5))
    entry = st.one_of(ENERGIES, ENERGIES, ENERGIES, st.just(math.inf))
    rows = [[draw(entry) for _ in range(n)] for _ in range(n)]
    return rows, Fraction(draw(TEMPERATURES))


def largest_eigenvalue(rows, temperature):
    """Return the largest real eigenvalue with as many digits as are set."""
    n = len(rows)
    matrix = mpmath.matrix(n, n)
    for i in range(n):
        for j in range(n):
            exponent = 0 if rows[i][j] == math.inf else -rows[i][j] / temperature
            if rows[i][j] != math.inf:
                matrix[i, j] = mpmath.exp(mpmath.mpf(exponent.numerator) / exponent.denominator)
    return max(value.real for value in mpmath.eig(matrix, left=False, right=False))


def irreducible(rows):
    n = len(rows)
    reach = [[rows[i][j] != math.inf for j in range(n)] for i in range(n)]
    for k in range(n):
        for i in range(n):
            for j in range(n):
                reach[i][j] = reach[i][j] or (reach[i][k] and reach[k][j])
    return all(map(all, reach))


@pytest.mark.parametrize("arithmetic", NAMES)
@settings(max_examples=40)
@given(case=matrices())
def test_random_matrices(arithmetic, case):
    rows, temperature = case
    with pytest.MonkeyPatch.context() as patch:
        use(arithmetic, patch)
        chain = Chain(colours(len(rows)), [bond(Table(rows))])
        try:
            found = [certify(chain.at(T=temperature), digits) for digits in (6, 25, 60)]
        except SolveError as error:
            assert "forbidden" in str(error)
            return
    assert all(certificate.exact_input for certificate in found)
    # A reducible matrix may be defective, which halves the digits of the reference.
    with mpmath.workprec(2 * found[-1].bits + 600 if irreducible(rows) else 6 * found[-1].bits + 3000):
        value = largest_eigenvalue(rows, temperature)
        f = -mpmath.mpf(temperature.numerator) / temperature.denominator * mpmath.log(value)
        exact = abs(value - 1) < mpmath.mpf(2) ** (-mpmath.mp.prec // 8)
    for certificate in found:
        assert certificate.contains(0 if exact else f)
        assert certificate.certified
    widths = [certificate.free_energy.radius for certificate in found]
    assert widths[0] >= widths[1] >= widths[2]
    assert widths[0] > widths[2] or not widths[0]


@pytest.mark.parametrize("arithmetic", NAMES)
@settings(max_examples=15)
@given(case=random_chains())
def test_random_chains_with_interiors_weights_and_ranges(arithmetic, case):
    with pytest.MonkeyPatch.context() as patch:
        use(arithmetic, patch)
        certificate = certify(case.chain.at(**case.values), 20)
    reference = Reference(case.chain, case.values).free_energy()
    assert certificate.exact_input
    if certificate.certified:
        assert certificate.contains(reference)
    else:
        assert abs(reference) < 1e-60 and certificate.contains(0)


@pytest.mark.parametrize("arithmetic", NAMES)
@pytest.mark.parametrize("animal", ZOO, ids=ZOO_NAMES)
def test_the_zoo(animal, arithmetic, monkeypatch):
    use(arithmetic, monkeypatch)
    certificate = certify(animal.chain.at(**animal.values), 50)
    assert certificate.exact_input and certificate.digits >= 50
    assert certificate.contains(Reference(animal.chain, animal.values).free_energy())


@pytest.mark.skipif(not HAVE_FLINT, reason="needs python-flint")
@pytest.mark.parametrize("animal", ZOO, ids=ZOO_NAMES)
def test_the_spectra_of_the_zoo_have_the_right_count_and_agree_with_doubles(animal):
    certificate = certify(animal.chain.at(**animal.values))
    balls = certificate.spectrum
    assert sum(ball.multiplicity for ball in balls) == certificate.size
    root = balls[0]
    assert root.multiplicity == 1 and root.imag.radius == 0
    with mpmath.workdps(60):
        log = certificate.log_eigenvalue
        low, high = (mpmath.log(mpmath.mpf(x.numerator) / x.denominator) for x in (root.real.lower, root.real.upper))
        assert log.lower <= Fraction(str(high)) and Fraction(str(low)) <= log.upper
    for level in solve(animal.chain.at(**animal.values)).spectrum():
        value = complex(level.value)
        near = [
            ball
            for ball in balls
            if abs(float(ball.real.middle) - value.real) + abs(float(ball.imag.middle) - value.imag) < 1e-12
        ]
        assert len(near) == 1


@settings(max_examples=30)
@given(case=matrices(), factors=st.lists(st.floats(1e-3, 1e3), min_size=5, max_size=5))
def test_any_vector_gives_true_bounds(case, factors):
    rows, temperature = case
    chain = Chain(colours(len(rows)), [bond(Table(rows))])
    try:
        good = certify(chain.at(T=temperature))
    except SolveError:
        return

    def poor_start(self, vector, *_):
        self._tried = 4096
        return vector * factors[: len(vector)]

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(Bracket, "_restart", poor_start)
        poor = certify(chain.at(T=temperature), digits=10, bits=64)
    assert poor.free_energy.overlaps(good.free_energy)
    assert poor.certified or "not certified to 10 digits" in str(poor)
