"""Group G: helix-coil chains, ligand binding, the molecular zipper.

Models of statistical weights; the temperature plays a part in the zipper only.

All checks of group G are here.
"""

from __future__ import annotations

import math

import pytest

from tests.facts.near import near
from tmsolve import Chain, StateSet, bond, open_chain, site, solve, term, weight


def is_helix(a: str) -> int:
    """Return 1 for a helical residue, else 0."""
    return 1 if a == "h" else 0


ZIMM_BRAGG = Chain(
    StateSet(("c", "h")),
    [
        weight(site(lambda a, s: s if a == "h" else 1)),
        weight(bond(lambda a, b, sigma: sigma if (a, b) == ("c", "h") else 1)),
    ],
    observables={"helix": is_helix, "runs": bond(lambda a, b: 1 if (a, b) == ("c", "h") else 0)},
)


def test_zimm_bragg_finite_chain():
    """G01: Z and helicity, N = 12, s = 1.1, sigma = 0.01. Zimm & Bragg, J. Chem. Phys. 31, 526 (1959).

    A run of helix that starts at the first residue also costs sigma: the first residue weighs 1 or sigma.
    """
    chain = open_chain(ZIMM_BRAGG.at(T=1, s="1.1", sigma="0.01"), 12, left={"c": 1, "h": 0.01})
    near(math.exp(chain.log_Z), "2.3954072739529245246")
    near(chain.mean("helix"), "0.27135018366249168668")


@pytest.mark.parametrize(
    ("s", "expected"),
    [
        ("0.95", "0.062144097434963262793"),
        ("1", "0.5"),
        ("1.05", "0.93258033762873921449"),
        ("1.1", "0.97935311802960652313"),
    ],
    ids=lambda value: f"G02-ZimmBragg1959-{value}",
)
def test_zimm_bragg_infinite_chain(s, expected):
    """G02: helicity, sigma = 2e-4. Zimm & Bragg (1959); sigma of PBG from Zimm, Doty & Iso (1959)."""
    near(solve(ZIMM_BRAGG.at(T=1, s=s, sigma="2e-4")).mean("helix"), expected)


def test_zimm_bragg_sharpness():
    """G03: d theta/d ln s = 1/(4 sqrt sigma) and mean helix length 1 + 1/sqrt sigma, at s = 1, sigma = 2e-4.

    Zimm & Bragg, J. Chem. Phys. 31, 526 (1959).
    """
    middle = solve(ZIMM_BRAGG.at(T=1, s=1, sigma="2e-4"))
    near(middle.derivative("s", of="mean(helix)"), "17.67766952966369")
    near(middle.mean("helix") / middle.mean("runs"), "71.71067811865475")


def test_lifson_roig():
    """G05: Z and mean number of hydrogen-bonded residues, N = 10, w = 1.3, v = 0.048.

    Lifson & Roig, J. Chem. Phys. 34, 1963 (1961). A helical residue weighs w between two helical, else v.
    Both ends of the peptide are coil: one fixed coil residue on either side makes 12 sites.
    """

    def residue(before, a, after, w, v):
        if a == "c":
            return 1
        return w if before == after == "h" else v

    chain = Chain(
        StateSet(("c", "h")),
        [weight(residue, 0, 1, 2)],
        observables={"bonded": term(lambda a, b, c: 1 if a == b == c == "h" else 0, 0, 1, 2)},
    )
    ends = open_chain(chain.at(T=1, w="1.3", v="0.048"), 12, left="c", right="c")
    near(math.exp(ends.log_Z), "1.8525831051828612628")
    near(ends.total("bonded"), "0.5914237953672673921")


@pytest.mark.parametrize(
    ("n", "KL", "expected"),
    [
        (2, "1", "0.27639320225002103036"),
        (3, "1", "0.19425400402459374079"),
        (5, "2", "0.13856409786044023081"),
    ],
    ids=["G07-McGheeVonHippel-n2", "G07-McGheeVonHippel-n3", "G07-McGheeVonHippel-n5"],
)
def test_ligands_that_cover_several_sites(n, KL, expected):
    """G07: ligands per lattice site. McGhee & von Hippel, J. Mol. Biol. 86, 469 (1974) eq. 10.

    State 0 is free; k = 1..n is the k-th site under a ligand, so k < n is followed by k + 1 and n by 0 or 1.
    """

    def order(a, b):
        follows = b == a + 1 if 0 < a < n else b <= 1
        return 0 if follows else math.inf

    chain = Chain(
        StateSet(range(n + 1)),
        [bond(order), weight(site(lambda a, KL: KL if a == 1 else 1))],
        observables={"bound": lambda a: 1 if a == 1 else 0},
    )
    near(solve(chain.at(T=1, KL=KL)).mean("bound"), expected)


def zipper(links: int, T):
    """Return an open chain of links, 10 open states of energy 1, opened from the left; the last is shut."""
    chain = Chain(
        StateSet(("open", "shut"), weights=(10, 1)),
        [
            site(lambda a, eps: eps if a == "open" else 0),
            bond(lambda a, b: math.inf if a == "shut" and b == "open" else 0),
        ],
        observables={"open": lambda a: 1 if a == "open" else 0},
    )
    return open_chain(chain.at(T=T, eps=1), links, right="shut")


def test_molecular_zipper():
    """G09: N = 20, G exp(-eps/T) = 0.9: Z and mean number of open links.

    C. Kittel, Am. J. Phys. 37, 917 (1969).
    """
    T = 1 / math.log(10 / 0.9)
    chain = zipper(20, T)
    near(math.exp(chain.log_Z), "8.7842334540943071199")
    near(chain.total("open"), "6.231934801689435001")


def test_molecular_zipper_transition():
    """G09: at T_c = eps/ln G every number of open links weighs the same, so their mean is (N - 1)/2.

    Kittel (1969).
    """
    from scipy.optimize import brentq

    found = brentq(lambda T: zipper(20, T).total("open") - 19 / 2, 0.3, 0.6, xtol=1e-15, rtol=1e-14)
    near(found, "0.43429448190325182765")
    near(math.exp(zipper(20, "0.43429448190325182765").log_Z), "20")
