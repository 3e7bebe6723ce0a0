"""Eigenvalues that nearly or exactly coincide: amplitudes, powers of the distance, lengths, against mpmath."""

from __future__ import annotations

import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest

from tmsolve import Chain, SolveError, StateSet, bond, colours, delta, models, site, solve, weight
from tmsolve.assemble.window import build_window
from tmsolve.observe import settle
from tmsolve.observe.multiplicity import Multiplicity, multiplicity

DIGITS = 200


def chain_of(energy, values, extra=()):
    """Return a chain of states 0, 1, …; ``extra`` are (s, t, parameter), added to the energy of that step."""
    terms = [bond(lambda s, t: energy[s][t])]
    for s0, t0, name in extra:
        scope = {"s0": s0, "t0": t0}
        exec(f"def step(s, t, {name}): return {name} if (s, t) == (s0, t0) else 0", scope)
        terms.append(bond(scope["step"]))
    return Chain(StateSet(range(len(values))), terms, observables={"a": lambda s: values[s]})


def exact_modes(matrix, values):
    """Return (λ/λ₁, amplitude) of all other modes by eigenvectors in the working precision, largest |λ| first."""
    roots, right = mpmath.eig(matrix, left=False, right=True)
    left = mpmath.inverse(right)
    top = max(range(len(roots)), key=lambda k: mpmath.re(roots[k]))
    diagonal = mpmath.diag([mpmath.mpf(v) for v in values])
    found = []
    for k in range(len(roots)):
        if k != top:
            amplitude = (left[top, :] * diagonal * right[:, k])[0] * (left[k, :] * diagonal * right[:, top])[0]
            found.append((roots[k] / roots[top], amplitude))
    return sorted(found, key=lambda mode: -abs(mode[0]))


def boltzmann(energy, T, extra=()):
    n = len(energy)
    table = [[mpmath.mpf(energy[s][t]) for t in range(n)] for s in range(n)]
    for s, t, value in extra:
        table[s][t] += mpmath.mpf(value)
    return mpmath.matrix([[mpmath.exp(-x / mpmath.mpf(T)) for x in row] for row in table])


#: Energies, values, T, step that is tuned, by how much. From a search of random chains: the first three were
#: silently wrong by up to 11 orders of magnitude, the others stand for usual pairs.
CLOSE = [
    ([[-2, 0, 0], [0, -2, 0], [0, 0, -2]], [-1, 1, -1], "1/5", (2, 1), "-2e-4"),
    ([[-2, 0, 0], [0, -2, 0], [0, 0, -2]], [-1, 2, 1], "1", (0, 1), "1e-12"),
    ([[0, 1, 1], [1, 0, 1], [1, 1, 0]], [1, 2, 0], "1/2", (1, 2), "3e-15"),
    ([[0, 1, 1, 1], [1, 0, 1, 1], [1, 1, 0, 1], [1, 1, 1, 0]], [1, -2, 0, 1], "1/2", (0, 3), "1e-7"),
    ([[0, 1, 2], [2, 0, 1], [1, 2, 0]], [0, 1, 2], "1", (0, 0), "1e-9"),
    ([[1, -1, 2, 0], [-1, 1, 0, 2], [2, 0, 1, -1], [0, 2, -1, 1]], [1, 0, 2, -1], "3/2", (0, 0), "1e-13"),
]


@pytest.mark.parametrize(("energy", "values", "T", "step", "by"), CLOSE)
def test_the_slowest_of_close_modes_counts_alone(energy, values, T, step, by):
    chain = chain_of(energy, values, [(*step, "e")])
    r = solve(chain.at(T=Fraction(T), e=by))
    with mpmath.workdps(DIGITS):
        t = mpmath.mpf(Fraction(T).numerator) / Fraction(T).denominator
        shown = [m for m in exact_modes(boltzmann(energy, t, [(*step, by)]), values) if abs(m[1]) > 1e-60]
        ratio, amplitude = shown[0]
        pair = abs(mpmath.im(ratio)) > 1e-60
        wanted = float(-mpmath.log(-mpmath.log(abs(ratio)))), float(abs(amplitude) * (2 if pair else 1))
    assert float(r.log_correlation_length("a")) == pytest.approx(wanted[0], rel=1e-11, abs=1e-11)
    assert float(r.correlation_amplitude("a")) == pytest.approx(wanted[1], rel=1e-9)
    assert r.correlation_power("a") == 0


@pytest.mark.parametrize("shift", ["1e-3", "-1e-7", "1e-12"])
def test_amplitudes_beside_a_merging_pair(shift):
    """Next-nearest Ising chain beside its disorder point (Stephenson 1970): A grows as the pair merges."""
    with mpmath.workdps(60):
        T = mpmath.nstr(mpmath.mpf("0.60951825606995181141578670") + mpmath.mpf(shift), 40)
    r = solve(models.load("ising_nnn").chain.at(T=T, J1=1, J2="-0.3", h=0))
    with mpmath.workdps(DIGITS):
        b, x = 1 / mpmath.mpf(T), mpmath.mpf("-0.3")
        # Bonds τ = s s' see a field J1 and the coupling J2; ⟨s₀ s_r⟩ is the mean of a product of r bonds.
        even = mpmath.matrix([[mpmath.exp(b * (x * p * q + mpmath.mpf(p + q) / 2)) for q in (1, -1)] for p in (1, -1)])
        odd = mpmath.matrix(
            [[p * mpmath.exp(b * (x * p * q + mpmath.mpf(p + q) / 2)) for q in (1, -1)] for p in (1, -1)]
        )
        first, vectors = mpmath.eigsy(even)
        top = max(range(2), key=lambda k: first[k])
        vector = vectors[:, top]
        c = [(vector.T * (odd / first[top]) ** n * vector)[0] for n in range(2)]
        roots = mpmath.eig(odd / first[top], left=False, right=False)
        roots = sorted(roots, key=lambda z: -abs(z))
        amplitude = (c[1] - roots[1] * c[0]) / (roots[0] - roots[1])
        pair = abs(mpmath.im(roots[0])) > 1e-40
        wanted = float(abs(amplitude)) * (2 if pair else 1)
    assert float(r.correlation_amplitude("m")) == pytest.approx(wanted, rel=1e-9)


NILPOTENT = [[1, 1, -2], [-1, -1, 2], [0, 0, 0]]


def defective(values):
    """W = 1 + c·J + x·N with N² = 0, N and its transpose killing constants: 1 is a double root with one vector."""
    return Chain(
        StateSet(range(3)),
        [weight(bond(lambda s, t, c, x: int(s == t) + c + x * NILPOTENT[s][t]))],
        observables={"a": lambda s: values[s], "b": lambda s: (1, 1, -2)[s]},
    )


@pytest.mark.parametrize(
    ("c", "x"), [("1/5", "1/20"), ("1/64", "1/256"), ("1/1048576", "1/4194304"), ("1/1048576", "1/1073741824")]
)
def test_a_jordan_block_near_and_far_from_the_largest_eigenvalue(c, x):
    """⟨a₀a_r⟩ − ⟨a⟩² = (1 + 3c)^{−r} (a·P a + r x a·N a)/3, by hand; P takes the mean away."""
    values = (1, 0, 3)
    c, x = Fraction(c), Fraction(x)
    r = solve(defective(values).at(T=1, c=c, x=x))
    log_gap = float(mpmath.log(mpmath.log1p(3 * mpmath.mpf(c.numerator) / c.denominator)))
    levels = r.spectrum()
    assert [(level.multiplicity, level.kind) for level in levels] == [(1, "simple"), (2, "Jordan")]
    assert levels[1].log_gap == pytest.approx(log_gap, rel=1e-13)
    slope = sum(values[s] * NILPOTENT[s][t] * values[t] for s in range(3) for t in range(3))
    assert float(r.correlation_amplitude("a")) == pytest.approx(float(abs(slope * x / 3)), rel=1e-12)
    assert r.correlation_power("a") == 1
    # (1, 1, −2) is not moved by N: its own correlation has no power of r.
    assert r.correlation_power("b") == 0 and float(r.correlation_amplitude("b")) == pytest.approx(2, rel=1e-12)
    for a in (None, "a", "b"):
        assert -float(r.log_correlation_length(a)) == pytest.approx(log_gap, rel=1e-13)


def test_two_blocks_that_coincide_stay_semisimple_next_to_the_largest_eigenvalue():
    """Potts with five colours at low temperature: four equal eigenvalues within 1e-8 of λ₁, each with a vector."""
    r = solve(Chain(colours(5), [bond(lambda s, t, J: -J * delta(s, t))]).at(T="0.05", J=1))
    assert [(level.multiplicity, level.kind) for level in r.spectrum()] == [(1, "simple"), (4, "semisimple")]


def test_equal_eigenvalues_are_counted_together():
    """Potts chain, one colour against the rest: A = (q − 1)/q² for δ(s, 0), here seen without lumping of colours."""
    chain = Chain(colours(3), [bond(lambda s, t, J: -J * delta(s, t))], observables={"v": lambda s: (0, 1, 3)[s]})
    T = np.linspace(0.3, 2, 1500)
    one = solve(chain.at(T=1, J=1)).correlation_amplitude("v")
    assert float(one) == pytest.approx(10 / 3 - 16 / 9, rel=1e-13)  # all of the variance
    assert solve(chain.at(T=T, J=1)).correlation_amplitude("v") == pytest.approx(np.full(1500, 14 / 9), rel=1e-12)


def test_what_is_out_of_reach_is_said(monkeypatch):
    monkeypatch.setattr(settle, "_PATIENCE", 0.0)
    chain = chain_of([[-2, 0, 0], [0, -2, 0], [0, 0, -2]], [-1, 2, 1], [(0, 1, "e")])
    r = solve(chain.at(T=1, e=[0.5, 1e-12, 1e-13]))
    for ask in (r.correlation_amplitude, r.correlation_power):
        with pytest.raises(
            SolveError, match=r"amplitude .* of a is not known at Point\(e=1e-12, T=1\), nor at 1 "
        ) as e:
            ask("a")
        assert "Give energies as exact numbers" in str(e.value)
    assert np.isnan(e.value.partial).tolist() == [False, True, True]
    assert np.isfinite(r.correlation_length("a")).all()


def test_energies_that_are_rounded_do_not_part_eigenvalues():
    """Five directions, cos 2πn/5 as floats: the doublet counts as one, A = 1/2 for cos of the direction."""
    angle = [2 * math.pi * n / 5 for n in range(5)]
    chain = Chain(
        StateSet(range(5)),
        [bond(lambda s, t, J: -J * math.cos(angle[s] - angle[t]))],
        observables={"c": lambda s: math.cos(angle[s])},
    )
    assert float(solve(chain.at(T=1, J=1)).correlation_amplitude("c")) == pytest.approx(0.5, rel=1e-12)


@pytest.mark.parametrize(
    ("chain", "values", "expected"),
    [
        (models.load("potts", q=4).chain, {"J": 1, "h": 0}, Multiplicity(4, 2, False)),
        (models.load("ising_nnn").chain, {"J1": 1, "J2": 0, "h": 0}, Multiplicity(2, 2, False)),
        (defective((0, 0, 1)), {"c": "0.3", "x": "0.1"}, Multiplicity(3, 2, True)),
        (
            Chain(colours(3), [site(lambda s, h: -h * delta(s, 0)), bond(lambda s, t: 0)]),
            {"h": 1},
            Multiplicity(1, 1, False),
        ),
    ],
)
def test_eigenvalues_are_counted_exactly(chain, values, expected):
    window = build_window(chain, ())
    point = chain.at(T=1, **values)
    assert multiplicity(window, np.arange(window.shape[0]), point.values) == expected


#: Trivial second neighbours: the matrix between pairs of sites has a nilpotent block beside two eigenvalues.
DRESSED = Chain(
    StateSet([-2, 1]),
    [bond(lambda s, t, E: E * (s != t)), bond(lambda s, t, F: F, shift=2)],
    observables={"b": bond(lambda s, t: s * t), "c": bond(lambda s, t: s * t, shift=2)},
)


def pair_function(E, T, r):
    """Return ⟨s₀s₂ s_r s_{r+2}⟩ − ⟨s₀s₂⟩² with energy E between unlike neighbours, r ≥ 2, by 2 × 2 matrices."""
    w = mpmath.exp(-mpmath.mpf(E) / T)
    chance = mpmath.matrix([[1, w], [w, 1]]) / (1 + w)
    spin = mpmath.diag([-2, 1])
    half = mpmath.matrix([[mpmath.mpf(1) / 2, mpmath.mpf(1) / 2]])
    ones = mpmath.matrix([1, 1])
    pair = spin * chance**2 * spin
    return (half * pair * chance ** (r - 2) * pair * ones)[0] - (half * pair * ones)[0] ** 2


@pytest.mark.parametrize("E", ["-2", "1", "3"])
def test_a_nilpotent_block_does_not_spoil_the_vectors_of_other_modes(E):
    r = solve(DRESSED.at(T=2, E=E, F=1))
    with mpmath.workdps(100):
        t = mpmath.tanh(mpmath.mpf(E) / 4)
        wanted = float(pair_function(E, 2, 40) / abs(t) ** 40)
    assert float(r.correlation_length("c")) == pytest.approx(float(-1 / mpmath.log(abs(t))), rel=1e-12)
    assert float(r.correlation_amplitude("c")) == pytest.approx(abs(wanted), rel=1e-11)


def test_hidden_slower_modes_do_not_grow_in_far_correlations():
    """Blume–Capel, D = 0.9, T = 0.1: ξ of s² is 0.4, that of s 1e4; far out only the even mode may be left."""
    chain = models.load("blume_capel").chain
    found = solve(chain.at(T="0.1", J=1, D="0.9", h=0)).correlation("q", "q", [3, 30, 60, 100])
    with mpmath.workdps(200):
        b, D = mpmath.mpf(10), mpmath.mpf("0.9")
        weight = lambda s, t: mpmath.exp(b * (s * t - D * (s * s + t * t) / 2))  # noqa: E731
        matrix = mpmath.matrix([[weight(s, t) for t in (-1, 0, 1)] for s in (-1, 0, 1)])
        modes = [(x, a) for x, a in exact_modes(matrix, (1, 0, 1)) if abs(a) > 1e-100]
        wanted = [float(mpmath.re(sum(a * x**r for x, a in modes))) for r in (3, 30, 60, 100)]
    assert found == pytest.approx(wanted, rel=1e-11, abs=0)


def test_short_lengths_in_large_batches():
    """Mixed spins in a strong field: λ₂/λ₁ is below doubles at ten of 2000 points; 2 × 2 matrices by mpmath."""
    T = np.concatenate([np.linspace(0.5, 3, 1990), np.linspace(0.01, 0.011, 10)])
    chain = models.load("mixed_spin").chain
    found = solve(chain.at(T=T, J="0.00065", D="-0.68", h="-1.34")).correlation_length()
    for i in (0, 700, 1990, 1995, 1999):
        with mpmath.workdps(700):
            b, J = 1 / mpmath.mpf(repr(float(T[i]))), mpmath.mpf("0.00065")
            D, h, half = mpmath.mpf("-0.68"), mpmath.mpf("-1.34"), mpmath.mpf(1) / 2

            def entry(s, t, b=b, J=J, D=D, h=h):
                return sum(mpmath.exp(b * (J * m * (s + t) - D * m * m + h * (m + (s + t) / 2))) for m in (-1, 0, 1))

            matrix = mpmath.matrix([[entry(s, t) for t in (-half, half)] for s in (-half, half)])
            first, second = sorted(mpmath.eigsy(matrix, eigvals_only=True), key=lambda x: -abs(x))
            wanted = float(-1 / mpmath.log(abs(second / first)))
        assert found[i] == pytest.approx(wanted, rel=1e-9)
