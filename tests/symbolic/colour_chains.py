"""Chains whose number of colours is the symbol q, with what the tests compare them with."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import sympy as sp

from tmsolve import Chain, bond, colours, delta, ising, site, spins, term, weight

Q = sp.Symbol("q", positive=True)
BETA = sp.Symbol("beta", positive=True)


def same(s, t, J):
    """Return the energy of two neighbours of one colour."""
    return -J * delta(s, t)


def same_further(s, t, K):
    """Return the energy of two sites of one colour further apart."""
    return -K * delta(s, t)


def potts(special=(0,), q="q") -> Chain:
    """H = -J Σ δ(s, s') - h Σ δ(s, 0)."""
    return Chain(
        colours(q, special=special),
        [bond(same), site(lambda s, h: -h * delta(s, 0))],
        observables={"m": lambda s: delta(s, 0), "e": bond(lambda s, t: delta(s, t))},
    )


def next_nearest(q="q") -> Chain:
    """H = -J Σ δ(s_i, s_{i+1}) - K Σ δ(s_i, s_{i+2})."""
    return Chain(colours(q), [bond(same), bond(same_further, shift=2)])


def colouring(reach: int) -> Chain:
    """Sites at most so far apart have different colours."""
    return Chain(colours("q"), [bond(lambda s, t: math.inf if s == t else 0, shift=k) for k in range(1, reach + 1)])


def ladder(special=()) -> Chain:
    """Two legs with J along them and K on the rungs, in a field on one leg where a colour is special."""
    states = colours("q", special=special)
    terms = [
        bond(same, ("a", "a")),
        bond(same, ("b", "b")),
        bond(same_further, ("a", "b"), shift=0),
    ]
    if special:
        terms.append(site(lambda s, h: -h * (s == special[0]), "a"))
    return Chain({"a": states, "b": states}, terms)


def zoo() -> dict[str, Chain]:
    """Return chains of every kind: wide cuts, cells of several sites, sites summed out, other states, weights."""
    q, q0 = colours("q"), colours("q", special=(0,))
    diamond = [
        *(bond(same, pair, shift=0) for pair in (("n", "a"), ("n", "b"))),
        *(bond(same, pair) for pair in (("a", "n"), ("b", "n"))),
        bond(same_further, ("a", "b"), shift=0),
    ]
    return {
        "potts": Chain(q, [bond(same)]),
        "potts in a field": potts(),
        "two fields": Chain(
            colours("q", special=(0, 2)), [bond(same), site(lambda s, h, g: -h * (s == 0) - g * (s == 2))]
        ),
        "next nearest": next_nearest(),
        "next nearest in a field": Chain(q0, [*next_nearest().terms, site(lambda s, h: -h * (s == 0))]),
        "third neighbours": Chain(q, [*next_nearest().terms, bond(lambda s, t, L: -L * (s == t), shift=3)]),
        "three sites": Chain(
            q, [term(lambda a, b, c, J: -J * delta(a, b, c) + 3 * J * (a == c), 0, 1, 2), bond(same_further)]
        ),
        "ladder": ladder(),
        "ladder in a field": ladder(special=(0,)),
        "diamond": Chain({"n": q, "a": q, "b": q}, diamond),
        "with spins": Chain(
            {"s": ising(), "c": q},
            [
                bond(lambda s, t, J: -J * s * t, ("s", "s")),
                term(lambda s, a, t, b, K: -K * s * t * (a == b), ("s", 0), ("c", 0), ("s", 1), ("c", 1)),
            ],
        ),
        "spins summed out": Chain(
            {"c": q, "s": spins(1)},
            [
                term(lambda c, s, d, J: -J * s * (c == d), ("c", 0), ("s", 0), ("c", 1)),
                site(lambda s, D: D * s * s, "s"),
            ],
        ),
        "hard core": Chain(q, [*colouring(1).terms, bond(same_further, shift=2)]),
        "weights": Chain(q0, [weight(bond(lambda s, t, w: w if s == t else 1)), site(lambda s, h: -h * (s == 0))]),
        "not reversible": Chain(q, [term(lambda a, b, c, J: J * (a == b) * (b != c), 0, 1, 2)]),
        "sites alone": Chain(q0, [site(lambda s, h: -h * (s == 0))]),
    }


def values_of(chain: Chain, seed: int) -> dict[str, Fraction]:
    """Return generic positive values for the parameters and T."""
    draw = np.random.default_rng(seed)
    return {name: Fraction(int(draw.integers(2, 12)), 7) for name in (*chain.parameters, "T")}


def substitution(values: dict[str, Fraction], colours_: int) -> dict[sp.Symbol, sp.Expr]:
    """Return the same values for the symbols of a formula."""
    point = {sp.Symbol(n, real=True): sp.Rational(v.numerator, v.denominator) for n, v in values.items() if n != "T"}
    return {**point, BETA: sp.Rational(values["T"].denominator, values["T"].numerator), Q: sp.Integer(colours_)}


def equal_pairs(cells: int, colours_: int, *shifts: int) -> dict[tuple[int, ...], int]:
    """Count ring configurations by how many pairs at each distance are equal, by writing all of them down.

    The first site has colour 0; all others are the same by symmetry.
    """
    number = np.arange(colours_ ** (cells - 1))
    sites = [np.zeros(len(number), dtype=np.int8)]
    sites += [(number // colours_**k % colours_).astype(np.int8) for k in range(cells - 1)]
    code = np.zeros(len(number), dtype=np.int64)
    for shift in shifts:
        equal = sum((sites[i] == sites[(i + shift) % cells]).astype(np.int64) for i in range(cells))
        code = code * (cells + 1) + equal
    found: dict[tuple[int, ...], int] = {}
    for value, count in enumerate(np.bincount(code)):
        digits = [value // (cells + 1) ** k % (cells + 1) for k in range(len(shifts))]
        if count:
            found[tuple(reversed(digits))] = int(count) * colours_
    return found
