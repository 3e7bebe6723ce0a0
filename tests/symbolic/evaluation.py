"""Evaluating formulas with many digits, and the chains the symbolic tests share."""

from __future__ import annotations

from fractions import Fraction

import mpmath as mp
import sympy as sp

from tmsolve import Chain, bond, clock, colours, cos_turns, delta, ising, site, spins, term

DIGITS = 40


def symbol(name: str) -> sp.Symbol:
    """Return the symbol that closed forms use for a parameter, or for beta."""
    return sp.Symbol("beta", positive=True) if name == "beta" else sp.Symbol(name, real=True)


def value(expr, T="1", **parameters) -> mp.mpf | mp.mpc:
    """Return an expression at decimal parameters to 40 digits."""
    point = {symbol(name): sp.Rational(str(v)) for name, v in parameters.items()}
    point[symbol("beta")] = 1 / sp.Rational(str(T))
    with mp.workdps(DIGITS):
        return mp.mpmathify(sp.N(sp.sympify(expr).subs(point), DIGITS))


def agrees(expr, expected: str, rtol: str = "1e-20", **point) -> None:
    """Assert that an expression has a published decimal value."""
    with mp.workdps(DIGITS):
        got, target = value(expr, **point), mp.mpf(expected)
        assert abs(mp.im(got)) <= mp.mpf(10) ** -30 * abs(got)
        assert abs(got - target) <= mp.mpf(rtol) * max(abs(target), mp.mpf(10) ** -30), (got, expected)


def spectrum_agrees(form, expected: list, rtol: str = "1e-20", **point) -> None:
    """Assert that the eigenvalues, in any order and each as often as its multiplicity, are the expected ones."""
    with mp.workdps(DIGITS):
        left = [mp.mpmathify(value(expr, **point)) for expr, m in form.eigenvalues for _ in range(m)]
        for target in expected:
            wanted = mp.mpc(target["re"], target["im"]) if isinstance(target, dict) else mp.mpf(target)
            nearest = min(left, key=lambda x: abs(x - wanted))
            assert abs(nearest - wanted) <= mp.mpf(rtol) * abs(wanted), (nearest, wanted)
            left.remove(nearest)
        assert all(abs(x) < mp.mpf(10) ** -30 for x in left), left


def exact(number: str) -> Fraction:
    """Return a decimal string as a fraction."""
    return Fraction(number)


def spin(s):
    """Return the spin itself."""
    return s


def square(s):
    """Return the square of a spin."""
    return s * s


def ising_chain() -> Chain:
    """H = -J Σ s s' - h Σ s, s = ±1."""
    return Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)], observables={"m": spin})


def potts_chain(q: int) -> Chain:
    """H = -J Σ δ(s, s') - h Σ δ(s, 0)."""
    return Chain(
        colours(q),
        [bond(lambda s, t, J: -J * (s == t)), site(lambda s, h: -h * (s == 0))],
        observables={"m": lambda s: delta(s, 0)},
    )


def clock_chain(q: int) -> Chain:
    """H = -J Σ cos 2π(n - n')/q."""
    return Chain(
        clock(q), [bond(lambda n, k, J: -J * cos_turns(n - k, q))], observables={"m": lambda n: cos_turns(n, q)}
    )


def spin1_chain() -> Chain:
    """H = -J Σ S S' + D Σ S² - K Σ S² S'² - h Σ S, S = -1, 0, 1."""
    return Chain(
        spins(1),
        [
            bond(lambda s, t, J: -J * s * t),
            bond(lambda s, t, K: -K * s * s * t * t),
            site(lambda s, D, h: D * s * s - h * s),
        ],
        observables={"m": spin, "q": square},
    )


def next_nearest_chain(states=None) -> Chain:
    """H = -J1 Σ s_i s_{i+1} - J2 Σ s_i s_{i+2} - h Σ s."""
    return Chain(
        states or ising(),
        [
            bond(lambda s, t, J1: -J1 * s * t),
            bond(lambda s, t, J2: -J2 * s * t, shift=2),
            site(lambda s, h: -h * s),
        ],
        observables={"m": spin},
    )


def next_nearest_spin1() -> Chain:
    """Return the next-nearest-neighbour spin-1 chain with a crystal field, in a field."""
    chain = next_nearest_chain(spins(1))
    return Chain(spins(1), [*chain.terms, site(lambda s, D: D * s * s)], observables={"m": spin})


def ladder() -> Chain:
    """Two legs of Ising spins, J along the legs and R on the rungs."""
    return Chain(
        {"a": ising(), "b": ising()},
        [
            bond(lambda s, t, J: -J * s * t, ("a", "a"), shift=1),
            bond(lambda s, t, J: -J * s * t, ("b", "b"), shift=1),
            bond(lambda s, t, R: -R * s * t, ("a", "b"), shift=0),
        ],
        observables={"m": spin, "rung": bond(lambda s, t: s * t, ("a", "b"), shift=0)},
    )


def mixed_spin() -> Chain:
    """Spins 1/2 and 1 in turn: H = -J Σ S (s + s') + D Σ S²."""
    return Chain(
        {"s": spins("1/2"), "S": spins(1)},
        [
            bond(lambda s, t, J: -J * s * t, ("s", "S"), shift=0),
            bond(lambda s, t, J: -J * s * t, ("S", "s"), shift=1),
            site(lambda S, D: D * S * S, "S"),
        ],
        observables={"m": spin, "q": site(square, "S")},
    )


def diamond() -> Chain:
    """Node n and dimer a, b of spins ±1/2: H = Σ J1 (a + b)(n + n') + J2 a b - h (a + b + n)."""
    return Chain(
        {"n": spins("1/2"), "a": spins("1/2"), "b": spins("1/2")},
        [
            term(lambda n, a, b, J1: J1 * n * (a + b), ("n", 0), ("a", 0), ("b", 0)),
            term(lambda a, b, n, J1: J1 * n * (a + b), ("a", 0), ("b", 0), ("n", 1)),
            bond(lambda a, b, J2: J2 * a * b, ("a", "b"), shift=0),
            site(lambda s, h: -h * s),
        ],
        observables={"m": spin, "node": site(spin, "n")},
    )
