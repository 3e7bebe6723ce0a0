"""One realisation: against enumeration, closed formulas and chains with impurities; cold, and at 10⁶ cells."""

import itertools
import math
import time

import numpy as np
import pytest

from tests.refusal import refused
from tmsolve import Chain, bond, ising, open_chain, ring, site, spins, term, weight
from tmsolve.declare import StateSet
from tmsolve.disorder.arcs import Bypaths, Deviations
from tmsolve.disorder.realised import realisation
from tmsolve.errors import DeclarationError, NotApplicable, ParameterError, SolveError, TooLargeError

FIELD = Chain(
    ising(),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s, "e": bond(lambda s, t: s * t)},
    name="Ising chain",
)
SECOND = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, K: -K * s * t, shift=2), site(lambda s, h: -h * s)],
    observables={"m": lambda s: s, "far": bond(lambda s, t: s * t, shift=3)},
)
# The tail site "b" is summed within a window; a three-site term reaches across cells.
TWO_SITES = Chain(
    {"a": ising(), "b": StateSet((0, 1, 3), weights=(1, 2, 1))},
    [
        bond(lambda s, t, J: -J * s * t, ("a", "b"), 0),
        term(lambda s, t, u, K: -K * s * t * u, ("a", 0), ("b", 0), ("a", 1)),
        site(lambda s, h: -h * s),
    ],
    observables={
        "a": site(lambda s: s, "a"),
        "b": site(lambda s: s * s, "b"),
        "ab": bond(lambda s, t: s * t, ("a", "b"), 0),
    },
)
# No two neighbours are occupied; the activity differs from cell to cell.
HARD_CORE = Chain(
    StateSet((0, 1)),
    [weight(lambda n, m: 1 - n * m, 0, 1), weight(lambda n, z: z**n), bond(lambda n, m, U: -U * n * m, shift=2)],
    observables={"n": lambda n: n, "pair": bond(lambda n, m: n * m, shift=2)},
)


def enumerate_all(chain, values, arrays, cells, closed):
    """Return ln Z, probabilities, and observables per cell of every configuration."""
    kinds, temperature = list(chain.cell), values["T"]
    states = list(itertools.product(*(range(len(chain.cell[kind])) for kind in kinds)))
    logs, found = [], {name: [] for name in chain.observables}
    for configuration in itertools.product(states, repeat=cells):

        def placed(one, cell, configuration=configuration):
            at = [(kind, cell + shift) for kind, shift in one.sites]
            if not closed and any(not 0 <= c < cells for _, c in at):
                return None
            return [chain.cell[kind].values[configuration[c % cells][kinds.index(kind)]] for kind, c in at]

        log = sum(
            math.log(chain.cell[k].weights[i]) for cell in configuration for k, i in zip(kinds, cell, strict=True)
        )
        for one, cell in itertools.product(chain.terms, range(cells)):
            sites = placed(one, cell)
            if sites is not None:
                given = {name: arrays[name][cell] if name in arrays else values[name] for name in one.parameters}
                value = one.function(*sites, **given)
                log += (math.log(value) if value else -math.inf) if one.role == "weight" else -value / temperature
        logs.append(log)
        for name, parts in chain.observables.items():
            rows = [
                [part.function(*sites) if (sites := placed(part, c)) else 0 for c in range(cells)] for part in parts
            ]
            found[name].append(np.sum(rows, axis=0))
    top = max(logs)
    chances = np.exp(np.array(logs) - top)
    return top + math.log(chances.sum()), chances / chances.sum(), {a: np.array(v) for a, v in found.items()}


CASES = [
    (FIELD, 7, ("J", "h"), {"T": 0.7}),
    (SECOND, 6, ("J", "h"), {"T": 0.8, "K": -0.4}),
    (SECOND, 5, ("K",), {"T": 1 / 40, "J": 0.7, "h": 0.1}),
    (TWO_SITES, 4, ("K", "h"), {"T": 1.3, "J": 0.5}),
    (TWO_SITES, 3, ("J",), {"T": 1 / 30, "K": 0.2, "h": -0.3}),
    (HARD_CORE, 7, ("z",), {"T": 0.6, "U": 0.4}),
]


@pytest.mark.parametrize("boundary", ["open", "ring"])
@pytest.mark.parametrize("case", range(len(CASES)))
def test_everything_agrees_with_enumeration(case, boundary):
    chain, cells, names, values = CASES[case]
    rng = np.random.default_rng(case)
    arrays = {name: rng.uniform(0.2, 1.5, cells) * (rng.choice([-1, 1], cells) if name != "z" else 1) for name in names}
    log_Z, chances, found = enumerate_all(chain, values, arrays, cells, boundary == "ring")
    solved = realisation(chain.fix(**values), arrays, boundary)
    assert solved.cells == cells
    assert math.isclose(solved.log_Z, log_Z, rel_tol=1e-13)
    assert math.isclose(solved.free_energy, -values["T"] * log_Z, rel_tol=1e-13)
    for a, b in itertools.combinations_with_replacement(found, 2):
        means = chances @ found[a], chances @ found[b]
        scale = max(1, np.abs(found[a]).max() * np.abs(found[b]).max())
        assert np.allclose(solved.profile(a), means[0], rtol=0, atol=2e-13 * scale)
        assert math.isclose(solved.mean(a), means[0].mean(), rel_tol=1e-11, abs_tol=2e-13 * scale)
        raw = np.einsum("c,ci,cj->ij", chances, found[a], found[b])
        exact = np.einsum("c,ci,cj->ij", chances, found[a] - means[0], found[b] - means[1])
        assert abs(solved.covariance(a, b) - exact.sum()) < 1e-12 * scale * cells
        for i, j in itertools.product(range(cells), repeat=2):
            assert abs(solved.correlation(a, b, i, j) - exact[i, j]) < 2e-13 * scale
            if i == 1:
                assert abs(solved.correlation(a, b, i, j, connected=False) - raw[i, j]) < 3e-13 * scale


def test_rings_of_one_cell_and_open_chains_of_one_cell():
    free = Chain(ising(), [site(lambda s, h: -h * s)], observables={"m": lambda s: s}).fix(T=2)
    for boundary in ("open", "ring"):
        one = realisation(free, {"h": [0.8]}, boundary)
        assert math.isclose(one.log_Z, math.log(2 * math.cosh(0.4)), rel_tol=1e-15)
        assert math.isclose(one.correlation("m", "m", 0, 0), 1 - math.tanh(0.4) ** 2, rel_tol=1e-14)
    short = realisation(SECOND.fix(T=1, K=5), {"J": [3.0], "h": [0.5]})  # both bonds would leave the chain
    assert math.isclose(short.log_Z, math.log(1 + 2 * math.cosh(0.5)), rel_tol=1e-15)
    assert short.profile("far").tolist() == [0.0]


@pytest.mark.parametrize("temperature", [3.0, 1.0, 0.1])
def test_random_bonds_without_field(temperature):
    # ln Z = ln 2 + Σ ln 2cosh(J_i/T); ⟨s_i s_j⟩ = Π tanh(J_k/T): from summing spin after spin.
    bonds = np.random.default_rng(4).normal(size=3000)
    solved = realisation(FIELD.fix(T=temperature, h=0), {"J": bonds})
    k = bonds[:-1] / temperature
    assert math.isclose(solved.log_Z, math.log(2) + math.fsum(np.logaddexp(k, -k)), rel_tol=1e-15)
    assert np.abs(solved.profile("m")).max() < 1e-13
    assert np.allclose(solved.profile("e")[:-1], np.tanh(k), rtol=0, atol=2e-14)
    for i, j in ((5, 6), (100, 140), (2900, 2000), (7, 7)):
        low, high = sorted((i, j))
        assert math.isclose(solved.correlation("m", "m", i, j), np.prod(np.tanh(k[low:high])), rel_tol=1e-11)


def test_random_bonds_on_a_ring():
    # Z = Π 2cosh K (1 + Π tanh K), and the two ways around; from tracing the two eigenvectors.
    k = np.random.default_rng(9).normal(size=60)
    solved = realisation(FIELD.fix(T=1, h=0), {"J": k}, "ring")
    t, whole = np.tanh(k), np.prod(np.tanh(k))
    assert math.isclose(solved.log_Z, np.log(2 * np.cosh(k)).sum() + np.log1p(whole), rel_tol=1e-15)
    for i, j in ((0, 30), (10, 13), (50, 2)):
        low, high = sorted((i, j))
        inner = np.prod(t[low:high])
        assert math.isclose(solved.correlation("m", "m", i, j), (inner + whole / inner) / (1 + whole), rel_tol=1e-12)


@pytest.mark.parametrize(("boundary", "finite"), [("open", open_chain), ("ring", ring)])
@pytest.mark.parametrize("chain", [FIELD, SECOND])
def test_chains_with_an_impurity_in_every_cell(chain, boundary, finite):
    cells, rng = (50, np.random.default_rng(11)) if chain is FIELD else (12, np.random.default_rng(12))
    arrays = {"J": rng.normal(size=cells), "h": rng.normal(0.1, 0.6, cells)}
    shared = {"K": 0.3} if chain is SECOND else {}
    point = chain.at(T=0.8, J=1, h=0, **shared)
    cell_by_cell = {i: {name: array[i] for name, array in arrays.items()} for i in range(cells)}
    known = finite(point, cells, impurities=cell_by_cell)
    solved = realisation(chain.fix(T=0.8, **shared), arrays, boundary)
    assert math.isclose(solved.log_Z, float(known.log_Z), rel_tol=1e-14)
    assert np.allclose(solved.profile("m"), known.profile("m"), rtol=1e-11, atol=1e-15)
    assert math.isclose(solved.covariance("m"), float(known.covariance("m")), rel_tol=1e-12)
    for i, j in ((1, 1), (2, 3), (1, 10), (11, 4)) + (((3, 40), (45, 2)) if cells == 50 else ()):
        assert math.isclose(solved.correlation("m", "m", i, j), float(known.correlation("m", "m", i, j)), rel_tol=1e-11)


def test_low_temperature_domain_wall():
    # One wall between ends held in opposite directions may stand anywhere: m_i = 1 − 2 i / (N − 1).
    fields = np.zeros(101)
    fields[0], fields[-1] = 50, -50
    solved = realisation(FIELD.fix(T="1/400", J=1), {"h": fields})
    assert np.allclose(solved.profile("m"), 1 - np.arange(101) / 50, rtol=0, atol=1e-11)
    assert math.isclose(solved.log_Z, 400 * (100 - 2 + 100) + math.log(100), rel_tol=1e-15)
    # ⟨s_i s_j⟩ = 1 − 2 (j − i)/100 for walls with equal chances.
    assert math.isclose(solved.correlation("m", "m", 20, 60, connected=False), 0.2, rel_tol=1e-11)


def test_means_far_from_the_only_field_are_accurate_however_small():
    # ⟨s_i⟩ = tanh h · tanhⁱ J: nothing but the field in cell 0 breaks the symmetry.
    fields = np.zeros(400)
    fields[0] = 0.7
    solved = realisation(FIELD.fix(T=1, J=1), {"h": fields})
    assert np.allclose(solved.profile("m") / (np.tanh(0.7) * np.tanh(1) ** np.arange(400)), 1, rtol=0, atol=1e-11)
    fields[0] = 0
    assert realisation(FIELD.fix(T=1, J=1), {"h": fields}).profile("m").tolist() == [0] * 400
    # Three states and second neighbours, against long numbers.
    fields = np.zeros(60)
    fields[[3, 4]] = 0.5, -0.2
    known = open_chain(SECOND.at(T=1, J=0.5, K=-0.3, h=0), 60, impurities={i: {"h": fields[i]} for i in (3, 4)})
    far = realisation(SECOND.fix(T=1, J=0.5, K=-0.3), {"h": fields}).profile("m")
    assert np.abs(far[-1]) < 1e-5
    assert np.allclose(far / known.profile("m"), 1, rtol=0, atol=1e-11)


def test_ring_that_does_not_forget_along_a_turn():
    rng = np.random.default_rng(2)
    bonds = rng.choice([-1.0, 1.0], 40)
    for frustrated in (False, True):
        bonds[-1] *= np.prod(bonds) * (-1 if frustrated else 1)
        stiff = realisation(FIELD.fix(T="1/400", h=0), {"J": bonds}, "ring")
        assert isinstance(stiff._row(()).correlations, Bypaths)
        # With an odd number of negative bonds one bond is broken, each with the same chance.
        share = 1 - 2 * 27 / 40 if frustrated else 1
        assert math.isclose(stiff.correlation("m", "m", 3, 30), share * np.prod(bonds[3:30]), rel_tol=1e-11)
        ways = math.log(2 * 40) - 800 if frustrated else math.log(2)
        assert math.isclose(stiff.log_Z, 400 * 40 + ways, rel_tol=1e-15)
    # Neighbours always differ: two patterns, and fields choose between them.
    turn = Chain(
        ising(), [weight(lambda s, t: (1 - s * t) / 2, 0, 1), site(lambda s, h: -h * s)], observables={"m": lambda s: s}
    )
    h = rng.normal(size=10)
    flipping = realisation(turn.fix(T=1), {"h": h}, "ring")
    assert isinstance(flipping._row(()).correlations, Bypaths)
    drive = (h * (-1) ** np.arange(10)).sum()
    assert math.isclose(flipping.log_Z, math.log(2 * math.cosh(drive)), rel_tol=1e-14)
    assert np.allclose(flipping.profile("m"), math.tanh(drive) * (-1) ** np.arange(10), atol=1e-14)
    for i, j in ((1, 1), (1, 4), (8, 2)):
        exact = (-1) ** (i + j) / math.cosh(drive) ** 2
        assert abs(flipping.covariance("m")) < 1e-13  # the total is 0 in both patterns
        assert math.isclose(flipping.correlation("m", "m", i, j), exact, rel_tol=1e-11)
    refused(
        SolveError,
        lambda: realisation(turn.fix(T=1), {"h": h[:9]}, "ring"),
        "no configuration of these 9 cells is allowed",
    )
    soft = realisation(FIELD.fix(T=1, h=0), {"J": rng.normal(size=40)}, "ring")
    assert isinstance(soft._row(()).correlations, Deviations)


def test_a_million_cells():
    fields = np.random.default_rng(0).normal(size=10**6)
    start = time.process_time()
    solved = realisation(FIELD.fix(T=1, J=1), {"h": fields})
    profile = solved.profile("m")
    spent = time.process_time() - start
    assert spent < 8
    # γ = 1.440342124508 (integral equation), standard error about 0.0006.
    assert abs(solved.log_Z / 10**6 - 1.440342124508) < 0.003
    # χ = 1.58487 averaged over fields.
    part = realisation(FIELD.fix(T=1, J=1), {"h": fields[:200_000]})
    assert abs(part.susceptibility("m") - 1.58487) < 0.02
    # A window of the same fields far from its ends knows the profile in its middle.
    middle = realisation(FIELD.fix(T=1, J=1), {"h": fields[500_000:500_200]})
    assert np.allclose(middle.profile("m")[95:105], profile[500_095:500_105], rtol=0, atol=1e-12)
    assert math.isclose(
        middle.correlation("m", "m", 95, 105), solved.correlation("m", "m", 500_095, 500_105), rel_tol=1e-11
    )


def test_huge_fields_do_not_swallow_the_bonds_beside_them():
    """A field of 1e20 J holds its spin; its neighbour is then in the field J: <s> = tanh(J/T), ln Z adds up."""
    for huge in (1e14, 1e20, 1e45):
        found = realisation(FIELD.fix(T=1, J=1), {"h": [0, huge, 0, 0.3]})
        last = np.log(sum(np.exp(s + 0.3 * t + s * t) for s in (-1, 1) for t in (-1, 1)))
        assert found.profile("m")[:2] == pytest.approx([np.tanh(1), 1], rel=1e-14)
        assert found.log_Z == pytest.approx(huge + np.log(2 * np.cosh(1)) + last, rel=1e-15)


def test_bad_input():
    chain = FIELD.fix(T=1, J=1)
    refused(
        DeclarationError,
        lambda: realisation(FIELD.at(T=1, J=1, h=0), {"h": [1.0]}),
        "takes a chain with its temperature fixed",
    )
    refused(
        ParameterError,
        lambda: realisation(chain, {"h": [1.0]}, "rings"),
        "one of open, ring, got 'rings'. Did you mean 'ring'?",
    )
    refused(
        ParameterError,
        lambda: realisation(FIELD.fix(T=1), {"J": [1, 2, 3], "h": [1, 2]}),
        "'J' has 3 values and 'h' has 2",
    )
    refused(
        ParameterError,
        lambda: realisation(chain, {"h": [1.0, math.nan]}),
        "'h' must be finite in every cell, got nan in cell 1",
    )
    refused(ParameterError, lambda: realisation(chain, {"h": [math.inf]}), "got inf in cell 0")
    refused(
        ParameterError,
        lambda: realisation(chain, {"h": ["a", "b"]}),
        "'h' takes real numbers, one per cell, got ['a', 'b']",
    )
    refused(ParameterError, lambda: realisation(chain, {"h": [1j, 2]}), "'h' takes real numbers")
    refused(ParameterError, lambda: realisation(chain, {"h": []}), "an array of shape (0,)")
    refused(ParameterError, lambda: realisation(chain, {"h": [[1, 2]]}), "an array of shape (1, 2)")
    refused(ParameterError, lambda: realisation(chain, {"hh": [1]}), "no parameter 'hh'")
    refused(ParameterError, lambda: realisation(chain, {"J": [1]}), "'J' is fixed in this chain")
    refused(ParameterError, lambda: realisation(chain, {"T": [1]}), "T cannot differ from cell to cell")
    refused(DeclarationError, lambda: realisation(chain, {}), "one value per cell")
    refused(ParameterError, lambda: realisation(FIELD.fix(J=1), {"h": [1]}), "the temperature is not fixed")
    refused(ParameterError, lambda: realisation(FIELD.fix(T=1), {"h": [1]}), "J")
    refused(ParameterError, lambda: realisation(FIELD.fix(T=1, J=1), {"h": [1, 1e51]}), "in cell 1", "1e50", "unit")
    steep = Chain(ising(), [site(lambda s, h: -1e300 * h * s)])
    refused(SolveError, lambda: realisation(steep.fix(T="1/400"), {"h": [1, 1e7]}), "larger than 1e250", "unit")
    refused(NotApplicable, lambda: realisation(FIELD.fix(T=0, J=1), {"h": [1]}), "T > 0, got T = 0")
    refused(
        ParameterError,
        lambda: realisation(SECOND.fix(T=1, J=1, K=1), {"h": [1, 2]}, "ring"),
        "at least 3 cells, because the longest term spans 2",
    )
    refused(
        TooLargeError,
        lambda: realisation(Chain(spins(8), [bond(lambda s, t, J: -J * s * t)]).fix(T=1), {"J": np.zeros(10**6)}),
        "Ask for fewer cells",
    )


def test_bad_questions():
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s, "zeeman": site(lambda s, h: -h * s)},
    )
    solved = realisation(chain.fix(T=1, J=1), {"h": [0.1, 0.2]})
    refused(
        ParameterError,
        lambda: solved.profile("zeeman"),
        "'zeeman' takes 'h', which differs from cell to cell; there are m without",
    )
    refused(ParameterError, lambda: solved.mean("n"), "no observable 'n'")
    for cell in (2, -1, True, 0.5):
        refused(ParameterError, lambda cell=cell: solved.correlation("m", "m", 0, cell), "cells are numbered 0 to 1")
    assert "mean(m)" in str(solved) and "zeeman" not in str(solved)
    with pytest.raises(ValueError, match="read-only"):
        solved.profile("m")[0] = 1
