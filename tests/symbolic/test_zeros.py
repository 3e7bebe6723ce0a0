"""Zeros of partition functions and the curves they lie on, against theorems, closed forms and other root finders."""

from __future__ import annotations

import cmath
import math
import sys
from fractions import Fraction

import mpmath as mp
import numpy as np
import pytest
import sympy as sp

from tests.refusal import refused
from tmsolve import (
    Chain,
    ParameterError,
    SolveError,
    TooLargeError,
    bond,
    clock,
    colours,
    cos_turns,
    delta,
    ising,
    occupation,
    site,
    spins,
    weight,
)
from tmsolve.errors import NotApplicable
from tmsolve.symbolic.counting.certified import certified_roots
from tmsolve.symbolic.counting.limiting import limiting_curve
from tmsolve.symbolic.counting.squarefree import square_free_parts
from tmsolve.symbolic.counting.zeros import zeros
from tmsolve.symbolic.deadline import TimeUp

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
BLUME_CAPEL = Chain(spins(1), [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)])
GAS = Chain(occupation(), [bond(lambda n, p: math.inf if n == p == 1 else 0), site(lambda n, mu: -mu * n)])


# --- theorems and closed forms


@pytest.mark.parametrize("boundary", ["ring", "open"])
def test_lee_yang_zeros_lie_on_the_unit_circle(boundary):
    """T. D. Lee and C. N. Yang, Phys. Rev. 87, 410 (1952): the circle theorem for the ferromagnet."""
    found = zeros(ISING.fix(J=1, T="0.7"), 24, variable="h", boundary=boundary)
    assert found.variable == "z = exp(-2*beta*h)" and len(found) == 24 and set(found.multiplicities) == {1}
    with mp.workdps(50):
        assert max(abs(abs(z) - 1) for z in found.zeros) < mp.mpf(10) ** -30
    assert found.error < 1e-30


def test_zeros_of_the_ising_ring_have_a_closed_form():
    """Lee & Yang (1952): λ₁ᴺ = −λ₂ᴺ gives cos θ = −e^−4K + (1 − e^−4K) cos((2n + 1) π/N)."""
    N = 12
    found = zeros(ISING.fix(J=1, T=2), N)
    with mp.workdps(50):
        x = mp.exp(-2)
        cosines = sorted(-x + (1 - x) * mp.cos((2 * n + 1) * mp.pi / N) for n in range(N // 2))
        got = sorted(z.real for z in found.zeros if z.imag > 0)
        assert max(abs(a - b) for a, b in zip(got, cosines, strict=True)) < mp.mpf(10) ** -35


@pytest.mark.parametrize("T", ["0.7", "2", "9"])
def test_edge_angle_from_the_discriminant(T):
    """Lee & Yang (1952): the gap ends at θ = 2 arcsin e^(−2J/T) in z = e^(−2βh)."""
    curve = limiting_curve(ISING.fix(J=1, T=T), points=12)
    z, y = sp.symbols("z y0")
    y_value = curve.factors[y]
    assert sp.simplify(sp.expand(curve.discriminant.as_expr() - (z - 1) ** 2).coeff(z).subs(y, y_value)) == 4 * sp.exp(
        sp.Rational(-4) / sp.Rational(T)
    )
    with mp.workdps(50):
        expected = 2 * mp.asin(mp.exp(-2 / mp.mpf(T)))
        assert sorted(round(float(mp.arg(e)), 12) for e in curve.edges) == [
            -round(float(expected), 12),
            round(float(expected), 12),
        ]
        assert abs(abs(mp.arg(curve.edges[0])) - expected) < mp.mpf(10) ** -30
    assert np.abs(np.abs(curve.points) - 1).max() < 1e-12
    assert np.angle(curve.points[np.abs(np.angle(curve.points)).argmin()]) ** 2 > float(expected) ** 2


def test_antiferromagnet_has_its_zeros_on_the_negative_axis():
    """For K < 0 the same formula has cos θ < −1: all zeros are real and negative."""
    found = zeros(ISING.fix(J=-1, T=1), 10)
    assert all(z.imag == 0 and z.real < 0 for z in found.zeros)


def test_hard_core_gas_edge():
    """Zeros of independence polynomials of cycles: −1/(4 cos²((2k−1)π/2N)); the edge is −1/4 (1/z = e^βμ)."""
    N = 9
    found = zeros(GAS, N, variable="mu")
    assert found.variable == "z = exp(-beta*mu)"
    with mp.workdps(40):
        expected = sorted(-4 * mp.cos((2 * k - 1) * mp.pi / (2 * N)) ** 2 for k in range(1, N // 2 + 1))
        got = sorted(z.real for z in found.zeros)
        assert max(abs(a - b) for a, b in zip(got, expected, strict=True)) < mp.mpf(10) ** -29
    curve = limiting_curve(GAS, variable="mu", points=40)
    assert [complex(e) for e in curve.edges] == [-4]
    assert np.abs(curve.points.imag).max() < 1e-9 and (curve.points.real > -4).all()


def test_potts_zeros_in_the_coupling():
    """(e^K + q − 1)^N + (q − 1)(e^K − 1)^N = 0 for q = 4 on a ring; |e^K + 3| = |e^K − 1| in the limit."""
    potts = Chain(colours(4), [bond(lambda s, t, J: -J * delta(s, t))])
    found = zeros(potts, 7, variable="J")
    assert found.variable == "z = exp(-beta*J)" and len(found) == 7
    with mp.workdps(40):
        for z in found.zeros:
            x = 1 / z
            assert abs((x + 3) ** 7 + 3 * (x - 1) ** 7) < mp.mpf(10) ** -25
    curve = limiting_curve(potts, variable="J", points=30)
    assert np.abs((1 / curve.points).real + 1).max() < 1e-10


def test_zeros_in_the_temperature_without_a_field():
    """(2 cosh K)^N + (2 sinh K)^N = 0: tanh K = e^(iπ(2n+1)/N)."""
    N = 6
    found = zeros(ISING.fix(J=1, h=0), N, variable="T")
    assert found.variable == "z = exp(-4*beta)" and found.polynomial.gens == (sp.Symbol("z"),)
    with mp.workdps(40):
        tangents = [mp.expjpi(mp.mpf(2 * n + 1) / N) for n in range(N)]
        expected = sorted({mp.nstr((((1 - t) / (1 + t)) ** 2).real, 20) for t in tangents})
        assert sorted(mp.nstr(z.real, 20) for z in found.zeros) == expected


# --- against other root finders, and multiplicities


def test_polynomial_against_enumeration_and_another_root_finder():
    found = zeros(BLUME_CAPEL.fix(J=1, T="1.1", D="0.4"), 5)
    x = sp.Symbol("z")
    numbers = found.polynomial.subs(found.factors)
    coefficients = [complex(c).real for c in sp.Poly(sp.N(numbers.as_expr(), 30), x).all_coeffs()]
    by_hand = [0.0] * 11
    for states in np.ndindex(*(3,) * 5):
        s = np.array(states) - 1
        energy = -(s * np.roll(s, 1)).sum() + 0.4 * (s * s).sum()
        by_hand[5 - s.sum()] += math.exp(-energy / 1.1)
    assert np.allclose(np.array(coefficients) / coefficients[0], np.array(by_hand) / by_hand[0], rtol=1e-12)
    expected = np.sort_complex(np.round(np.roots(by_hand), 8))
    assert np.allclose(np.sort_complex(np.round(found.array, 8)), expected, atol=1e-7)


def test_multiple_zeros_are_found_with_their_multiplicity():
    dimers = Chain(
        {"a": ising(), "b": ising()},
        [bond(lambda a, b, J: -J * a * b, ("a", "b"), 0), site(lambda a, h: -h * a)],
    )
    found = zeros(dimers.fix(J=1, T=1), 5)
    # e^K (1 + z²) + 2 e^−K z = 0 for each dimer.
    assert found.multiplicities == (5, 5) and found.array.shape == (10,)
    expected = cmath.rect(1, math.acos(-math.exp(-2)))
    assert abs(complex(found.zeros[0]) - expected) < 1e-15 and abs(complex(found.zeros[1]).imag + expected.imag) < 1e-15
    free = zeros(Chain(ising(), [site(lambda s, h: -h * s)]), 8)
    assert free.zeros == (mp.mpc(-1),) and free.multiplicities == (8,)
    assert str(free).splitlines()[1].endswith("-1.0 + 0.0 i  (8 times)")


def test_square_free_parts_over_other_symbols():
    z, y = sp.symbols("z y0")
    terms = {p: int(c) for p, c in sp.Poly((z + y) ** 3 * (z * y + 1), z, y).terms()}
    parts = {m: sp.Poly.from_dict(dict(part), z, y) for part, m in square_free_parts(terms)}
    assert parts == {3: sp.Poly(z + y, z, y), 1: sp.Poly(z * y + 1, z, y)}


@pytest.mark.parametrize("flint", [True, False])
def test_certified_roots_of_wilkinsons_polynomial(monkeypatch, flint):
    if not flint:
        monkeypatch.setitem(sys.modules, "flint", None)
    x = sp.Symbol("x")
    values = [int(c) for c in reversed(sp.Poly(sp.prod(x - k for k in range(1, 16)), x).all_coeffs())]
    roots, radii = certified_roots(lambda: ([mp.mpf(v) for v in values], [mp.mpf(0)] * len(values)), 25)
    assert all(abs(root - k) <= radius < 1e-23 for k, (root, radius) in enumerate(zip(roots, radii, strict=True), 1))
    assert all(root.imag == 0 for root in roots)


def test_a_double_root_is_not_certified():
    refused(SolveError, lambda: certified_roots(lambda: ([1, 2, 1], [mp.ldexp(1, -mp.mp.prec)] * 3), 10), "separated")


def test_without_python_flint_the_zeros_are_the_same(monkeypatch):
    chain = BLUME_CAPEL.fix(J=1, T="0.7", D="1.4")
    first = zeros(chain, 6)
    monkeypatch.setitem(sys.modules, "flint", None)
    second = zeros(chain, 6)
    assert all(
        abs(a - b) <= c + d for a, b, c, d in zip(first.zeros, second.zeros, first.errors, second.errors, strict=True)
    )


def test_weights_need_not_be_whole_here():
    chain = Chain(ising(), [weight(lambda s, w: w if s == 1 else 1), site(lambda s, h: -h * s)]).fix(w="0.3")
    found = zeros(chain, 3)
    assert found.multiplicities == (3,) and abs(complex(found.zeros[0]) + 0.3) < 1e-15


def test_irrational_energies_beside_the_variable():
    chain = Chain(clock(5), [bond(lambda s, t, J: -J * cos_turns(s - t, 5)), site(lambda s, h: -h * (s == 0))])
    found = zeros(chain.fix(J=1, T=1), 3)
    assert len(found.factors) >= 1
    for z in found.array:
        total = 0
        for s in np.ndindex(5, 5, 5):
            energy = -sum(math.cos(2 * math.pi * (a - b) / 5) for a, b in zip(s, (*s[1:], s[0]), strict=True))
            total += math.exp(-energy) * z ** (3 - sum(a == 0 for a in s))
        assert abs(total) < 1e-9 * 125 * math.exp(3) * max(1, abs(z)) ** 3
    refused(NotApplicable, lambda: zeros(chain.fix(J=1, h=0), 3, variable="T"), "irrational", "no polynomial")


# --- limiting curves


def test_blume_capel_zeros_approach_the_curve():
    """Zeros of longer rings come nearer, and every point of the curve has two eigenvalues of largest modulus."""
    chain = BLUME_CAPEL.fix(J=1, T="0.7", D="1.4")
    curve = limiting_curve(chain, points=90)
    assert len(curve.edges) == 4 and len(curve.arcs) == 4
    gaps = []
    for N in (6, 12):
        points = zeros(chain, N).array
        gaps.append(max(np.abs(curve.points - z).min() for z in points))
    assert gaps[1] < 0.06 and gaps[1] < gaps[0] + 0.02
    for z, angle in zip(curve.points[::37], curve.angles[::37], strict=True):
        s = np.arange(-1, 2)
        # z^(1−s) instead of e^(βhs), and the field on the row only.
        matrix = np.exp((np.outer(s, s) - 1.4 * s[:, None] ** 2) / 0.7) * (z ** (1 - s))[:, None]
        values = sorted(np.linalg.eigvals(matrix), key=abs, reverse=True)
        assert abs(abs(values[1] / values[0]) - 1) < 1e-8
        assert abs(abs(cmath.phase(values[1] / values[0])) - angle) < 1e-7


def test_edges_are_double_eigenvalues():
    chain = BLUME_CAPEL.fix(J=1, T="0.7", D="0.9")
    curve = limiting_curve(chain, points=10)
    assert len(curve.edges) == 4 and max(curve.errors) < 1e-30
    with mp.workdps(60):
        for edge in curve.edges:
            x, d = mp.exp(1 / mp.mpf("0.7")), mp.exp(-mp.mpf("0.9") / mp.mpf("0.7"))
            s = [-1, 0, 1]
            matrix = mp.matrix(3, 3)
            for i, a in enumerate(s):
                for j, b in enumerate(s):
                    matrix[i, j] = x ** (a * b) * d ** (a * a) * edge ** (1 - a)
            values = sorted(mp.eig(matrix, left=False, right=False), key=abs, reverse=True)
            assert abs(values[0] - values[1]) < mp.mpf(10) ** -14 * abs(values[0])


def test_a_single_eigenvalue_has_no_curve():
    curve = limiting_curve(Chain(ising(), [site(lambda s, h: -h * s)]))
    assert len(curve.points) == 0 and curve.edges == () and curve.discriminant == 1


def test_a_curve_in_the_coupling_without_edges():
    curve = limiting_curve(ISING.fix(h=0), variable="J", points=20)
    assert curve.edges == () and curve.variable == "z = exp(-4*beta*J)" and repr(curve).endswith("0 edges>")
    assert np.abs(curve.points.imag).max() < 1e-10 and curve.points.real.max() < 0


# --- messages


def test_messages():
    refused(ParameterError, lambda: zeros(ISING.at(J=1, h=0, T=1), 4), "zeros takes a chain", "got Point")
    refused(ParameterError, lambda: limiting_curve(3), "limiting_curve takes a chain", "got 3")
    tokens = Chain(colours("q"), [bond(lambda s, t, J: -J * delta(s, t))])
    refused(NotApplicable, lambda: zeros(tokens, 4, variable="J"), "q being a symbol")
    refused(NotApplicable, lambda: limiting_curve(tokens, variable="J"), "q being a symbol")
    refused(ParameterError, lambda: zeros(ISING.fix(J=1), 4), "besides 'h'", "chain.fix(T=…)")
    refused(ParameterError, lambda: zeros(ISING.fix(J=1, T=0), 4), "temperature above 0")
    refused(ParameterError, lambda: zeros(ISING.fix(T=1), 4), "numbers for J", "chain.fix(J=…)")
    refused(ParameterError, lambda: zeros(ISING.fix(J=1, h=0), 4), "'h' is fixed", "leave it free")
    refused(ParameterError, lambda: zeros(ISING.fix(J=1, T=1), 4, variable="H"), "'H'", "J, h, T", "Did you mean 'h'?")
    refused(ParameterError, lambda: zeros(ISING.fix(J=1, T=1), 4, digits=0), "from 1 to 1000", "got 0")
    refused(ParameterError, lambda: zeros(ISING.fix(J=1, T=1), 1), "at least 2", "got 1")
    refused(ParameterError, lambda: limiting_curve(ISING.fix(J=1, T=1), points=1), "points", "got 1")
    silent = Chain(ising(), [bond(lambda s, t, J: -J * s * t)], observables={"m": lambda s, c: c * s})
    refused(ParameterError, lambda: zeros(silent.fix(J=1, T=1), 4, variable="c"), "no energy", "depends on 'c'")
    refused(ParameterError, lambda: limiting_curve(silent.fix(J=1, T=1), variable="c"), "no energy", "'c'")
    weighed = Chain(ising(), [weight(lambda s, z: z if s > 0 else 1, 0)])
    refused(NotApplicable, lambda: zeros(weighed.fix(T=1), 4, variable="z"), "declare z = exp(beta*mu) by an energy")
    refused(NotApplicable, lambda: limiting_curve(weighed.fix(T=1), variable="z"), 'variable="mu"')
    never = Chain(ising(), [bond(lambda s, t: math.inf), site(lambda s, h: -h * s)])
    refused(NotApplicable, lambda: zeros(never, 4), "no configuration", "Z = 0")
    refused(NotApplicable, lambda: limiting_curve(never), "forbidden")
    slow = BLUME_CAPEL.fix(J=1, T=1, D=1)
    refused(TooLargeError, lambda: zeros(slow, 40, time_limit=0.05), "within 0.05 s", "fewer cells")
    refused(TooLargeError, lambda: limiting_curve(slow, time_limit=0.05), "within 0.05 s", "fewer points")
    wide = Chain(spins(3), [bond(lambda s, t: Fraction(1, 1 + abs(s - t) ** 3)), site(lambda s, h: -h * s)])
    refused(TooLargeError, lambda: zeros(wide.fix(T=1), 30), "entries of", "fewer cells")


def test_a_curve_is_kept_when_the_time_is_over_before_its_edges(monkeypatch):
    def late(*_):
        raise TimeUp

    monkeypatch.setattr("tmsolve.symbolic.counting.limiting._edges", late)
    monkeypatch.setattr("tmsolve.symbolic.counting.limiting.end_points", late)
    curve = limiting_curve(ISING.fix(J=1, T=1), points=8)
    assert len(curve.points) == 16 and not curve.has_edges and repr(curve).endswith("16 points, edges not known>")
    refused(NotApplicable, lambda: curve.discriminant, "not found within the time limit")


@pytest.mark.parametrize("chain", [ISING.fix(J=1, T=2), ISING.fix(J=-1, T=1), BLUME_CAPEL.fix(J=1, T="0.7", D="1.4")])
def test_edges_from_the_trace_are_roots_of_the_discriminant(chain, monkeypatch):
    exact = limiting_curve(chain, points=8)

    def late(*_):
        raise TimeUp

    monkeypatch.setattr("tmsolve.symbolic.counting.limiting._edges", late)
    traced = limiting_curve(chain, points=8)
    assert traced.has_edges and len(traced.edges) == len(exact.edges) > 0
    for z, other, error in zip(traced.edges, exact.edges, traced.errors, strict=True):
        assert abs(z - other) <= error < 1e-30 * abs(z)
    refused(NotApplicable, lambda: traced.discriminant, "not found within the time limit")


def test_too_many_eigenvalues(monkeypatch):
    monkeypatch.setattr("tmsolve.symbolic.counting.limiting._LARGEST", 2)
    error = refused(TooLargeError, lambda: limiting_curve(BLUME_CAPEL.fix(J=1, D=1, T=1)), "at most 2", "has 3")
    assert error.limit == 2
