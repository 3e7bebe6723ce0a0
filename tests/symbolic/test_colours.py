"""Chains with a symbolic number of colours against matrices, rings and solutions for given numbers."""

import math
from fractions import Fraction

import mpmath as mp
import networkx as nx
import numpy as np
import pytest
import sympy as sp

from tests.refusal import refused
from tests.symbolic.colour_chains import (
    BETA,
    Q,
    colouring,
    equal_pairs,
    ladder,
    next_nearest,
    potts,
    substitution,
    values_of,
    zoo,
)
from tests.symbolic.evaluation import potts_chain
from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    SolveError,
    bond,
    certify,
    closed_form,
    colours,
    crossovers,
    describe,
    ground_state,
    open_chain,
    phase_diagram,
    ring,
    scan,
    site,
    solve,
)
from tmsolve.symbolic.colours.check import colour_mismatch, from_symbols, plain_matrix
from tmsolve.symbolic.colours.matrix import colour_matrix, inserted_colour_matrices
from tmsolve.symbolic.recurrence import ring_sum, trace_of_power
from tmsolve.symbolic.spectrum import Spectrum
from tmsolve.tabulate.colours import plain_chain

ZOO = zoo()
J, K, H = sp.symbols("J K h", real=True)
N = sp.Symbol("N", integer=True, positive=True)
FIELD, ZERO = closed_form(potts()), closed_form(potts().fix(h=0))
SQUARE = closed_form(colouring(2))


@pytest.fixture(scope="module")
def forms():
    found = {}

    def form(name):
        if name not in found:
            found[name] = closed_form(ZOO[name])
        return found[name]

    return form


def in_q(expr, values):
    """Return a formula at given parameters as a function of the number of colours."""
    point = substitution(values, 1)
    function = sp.lambdify([*point], expr, "mpmath")
    numbers = [mp.mpf(int(value.p)) / int(value.q) for value in point.values()]
    return lambda q: float(function(*(q if symbol == Q else x for symbol, x in zip(point, numbers, strict=True))))


# --- blocks and partition functions


@pytest.mark.parametrize("name", ZOO)
def test_sizes_times_multiplicities_make_up_the_matrix(name, forms):
    matrix = colour_matrix(ZOO[name])
    for blocks in (matrix.sectors(), forms(name).blocks):
        assert sp.expand(sum(b.size * b.multiplicity for b in blocks) - matrix.rows) == 0
    for q in range(matrix.special, 5):
        dense = plain_matrix(ZOO[name], q, values_of(ZOO[name], 0)) if q else np.empty((0, 0))
        assert matrix.rows.subs(Q, q) == len(dense) or not matrix.window.left


@pytest.mark.parametrize("name", ZOO)
def test_rings_equal_those_of_given_numbers_of_colours(name, forms):
    """For few colours some representations vanish or have negative dimension; the identity holds all the same."""
    chain, form = ZOO[name], forms(name)
    least = max(max(len(states.special) for states in chain.cell.values()), 1)
    shortest = max(term.reach for term in chain.terms) + 1
    values = values_of(chain, 1)
    for cells in (shortest, shortest + 2):
        formula = in_q(form.partition_function(cells), values)
        for q in range(least, 6 if "third" not in name else 5):
            dense = plain_matrix(chain, q, values)
            assert formula(q) == pytest.approx(np.trace(np.linalg.matrix_power(dense, cells)), rel=1e-10)


@pytest.mark.parametrize("cells", range(3, 10))
def test_next_nearest_neighbours_agree_with_enumeration(cells, forms):
    """Exactly, by numbers of equal pairs, for q = 2 … 6 and all rings that do not bite their tail."""
    spectrum = forms("next nearest").spectrum
    classes = [BETA * J, BETA * K, sp.log(Q)]
    order = [spectrum.matrix.alphabet.classes.index(key) for key in classes]
    terms = {tuple(x[i] for i in order): c for x, c in ring_sum(spectrum, cells).items()}
    for q in range(2, 7):
        counted = {}
        for (a, b, power), c in terms.items():
            counted[a, b] = counted.get((a, b), 0) + c * q**power
        assert {pair: count for pair, count in counted.items() if count} == equal_pairs(cells, q, 1, 2)


def test_the_formula_of_a_ring_is_the_polynomial_counted(forms):
    Z = forms("next nearest").partition_function(5)
    counts = equal_pairs(5, 3, 1, 2)
    assert sp.expand(Z.subs(Q, 3) - sum(c * sp.exp(BETA * (a * J + b * K)) for (a, b), c in counts.items())) == 0
    assert sp.Poly(Z, Q).degree() == 5


def test_powers_of_the_blocks_give_the_same_rings(forms):
    for name in ("next nearest in a field", "with spins"):
        spectrum = forms(name).spectrum
        bare = Spectrum(spectrum.matrix, spectrum.writer)
        assert trace_of_power(bare, 4) == ring_sum(spectrum, 4)
        assert trace_of_power(spectrum, 4) == ring_sum(spectrum, 4)


def test_blocks_of_next_nearest_neighbours(forms):
    """Sizes by counting set partitions with marked parts: 2 with none, 3 with one mark, 1 with two."""
    found = {(b.size, sp.factor(b.multiplicity)) for b in forms("next nearest").blocks}
    assert found == {(2, 1), (3, Q - 1), (1, sp.factor(Q * (Q - 3) / 2)), (1, sp.factor((Q - 1) * (Q - 2) / 2))}


def test_marks_are_permuted_by_more_than_signs():
    """Three sites in a cut bring in the two-dimensional representation of three marks."""
    blocks = colour_matrix(ZOO["third neighbours"]).sectors()
    sizes = {b.label.split(" of ")[0].removeprefix("representation ").replace(" ", ""): b.size for b in blocks[1:]}
    assert blocks[0].size == 5
    assert sizes == {"(q-1,1)": 10, "(q-2,2)": 6, "(q-2,1,1)": 6, "(q-3,3)": 1, "(q-3,2,1)": 2, "(q-3,1,1,1)": 1}


def test_colours_that_nothing_singles_out_are_not_special():
    plain, named = ZERO, FIELD
    assert [b.multiplicity for b in plain.blocks] == [1, Q - 1]
    assert [b.multiplicity for b in named.blocks] == [1, Q - 2]
    assert plain.eigenvalues == closed_form(Chain(colours("q"), [bond(lambda s, t, J: -J * (s == t))])).eigenvalues
    assert plain.mean("m") == 1 / Q


def test_a_sympy_symbol_names_the_number():
    form = closed_form(Chain(colours(sp.Symbol("n")), [bond(lambda s, t, J: -J * (s == t))]))
    n = sp.Symbol("n", positive=True)
    assert form.partition_function() == (sp.exp(BETA * J) + n - 1) ** N + (n - 1) * (sp.exp(BETA * J) - 1) ** N


# --- published results


def test_b01_potts_ring_for_any_number_of_colours():
    """B01: Z = (e^K+q-1)^N + (q-1)(e^K-1)^N. F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982); from memory."""
    form = ZERO
    x = sp.exp(BETA * J)
    assert form.partition_function() == (x + Q - 1) ** N + (Q - 1) * (x - 1) ** N
    assert sp.expand(form.partition_function(5) - (x + Q - 1) ** 5 - (Q - 1) * (x - 1) ** 5) == 0
    assert "Z_N = (q + exp(beta*J) - 1)**N + (q - 1)*(exp(beta*J) - 1)**N" in str(form)
    assert form._repr_latex_().endswith(
        r"\left(q + e^{\beta J} - 1\right)^{N} + (q - 1) \left(e^{\beta J} - 1\right)^{N}$"
    )


def test_b05_chromatic_polynomial_of_the_cycle():
    """B05: (q-1)^N + (-1)^N (q-1), Whitney and Birkhoff; from memory. The antiferromagnet at T -> 0 is the same."""
    form = closed_form(colouring(1))
    assert sp.expand(form.partition_function() - (Q - 1) ** N - (Q - 1) * (-1) ** N) == 0
    for q, cells, count in ((3, 5, 30), (3, 6, 66), (4, 5, 240), (4, 6, 732), (5, 4, 260)):
        assert form.partition_function(cells).subs(Q, q) == count
    Z = ZERO.partition_function(6)
    left = sum(term for term in sp.Add.make_args(sp.expand(Z)) if not term.has(sp.exp))
    assert sp.expand(left - (Q - 1) ** 6 - (Q - 1)) == 0
    assert form.entropy == sp.log(Q - 1)


@pytest.mark.parametrize("cells", [5, 6])
def test_chromatic_polynomial_of_the_squared_cycle(cells, forms):
    """Sites up to two apart differ; the polynomial by deletion and contraction, NetworkX."""
    graph = nx.circulant_graph(cells, [1, 2])
    x = sp.Symbol("x")
    expected = nx.chromatic_polynomial(graph).subs(x, Q)
    Z = forms("next nearest").partition_function(cells)
    left = sum(term for term in sp.Add.make_args(sp.expand(Z)) if not term.has(sp.exp))
    assert sp.expand(left - expected) == 0
    assert sp.expand(SQUARE.partition_function(cells) - expected) == 0


def test_b06_potts_in_a_field_for_any_number_of_colours():
    """B06: l± and the (q-2)-fold e^K-1. Glumac & Uzelac, J. Phys. A 27, 7709 (1994); from memory."""
    values = FIELD.eigenvalues
    assert [m for _, m in values] == [1, 1, Q - 2]
    x, y = sp.exp(BETA * J), sp.exp(BETA * H)
    root = sp.sqrt((x * y - x - Q + 2) ** 2 + 4 * (Q - 1) * y)
    for (value, _), sign in zip(values[:2], (1, -1), strict=True):
        assert sp.simplify(sp.expand((2 * value - x * (y + 1) - Q + 2) ** 2 - root**2)) == 0
        assert sign * (2 * value - x * (y + 1) - Q + 2).subs({J: 1, H: 2, BETA: 1, Q: 5}).evalf() > 0
    assert values[2][0] == x - 1
    expected = ["4.736290362190538495249236", "1.281628369226371138433721", "1.013752707470476521624549"]
    with mp.workdps(40):
        point = {J: sp.Rational(7, 10), H: sp.Rational(2, 5), BETA: 1, Q: 3}
        for (value, _), target in zip(values, expected, strict=True):
            assert abs(mp.mpmathify(value.subs(point).evalf(35)) - mp.mpf(target)) < mp.mpf(10) ** -23


def test_b02_b03_and_b04_potts_without_field():
    """ln(e^K+q-1); ln((e^K+q-1)/(e^K-1)); c = K²(q-1)e^K/(e^K+q-1)². F. Y. Wu (1982); from memory."""
    form = ZERO
    x = sp.exp(BETA * J)
    assert form.free_energy == -sp.log(x + Q - 1) / BETA
    assert sp.simplify(form.specific_heat - (BETA * J) ** 2 * (Q - 1) * x / (x + Q - 1) ** 2) == 0
    ratio = sp.exp(-1 / form.correlation_length)
    assert sp.simplify(ratio - sp.Abs((x - 1) / (x + Q - 1))) == 0


# --- physics at given numbers of colours


@pytest.mark.parametrize("q", [3, 7])
def test_thermodynamics_equal_the_solutions_for_numbers(q):
    for form, reference in ((FIELD, potts_chain(q)), (ZERO, potts_chain(q).fix(h=0))):
        values = {"J": "0.7", "T": "0.9"} | ({} if "h" in form.chain.fixed else {"h": "0.4"})
        solution = solve(reference.at(**values))
        point = {"J": Fraction(7, 10), "h": Fraction(2, 5), "T": Fraction(9, 10)}
        for name in ("free_energy", "internal_energy", "entropy", "specific_heat"):
            got = in_q(getattr(form, name), point)(q)
            assert got == pytest.approx(float(getattr(solution, name)), rel=1e-11), name
        assert in_q(form.mean("m"), point)(q) == pytest.approx(float(solution.mean("m")), rel=1e-11)
        response = float(solution.susceptibility("m"))
        assert in_q(form.susceptibility("m"), point)(q) == pytest.approx(response, rel=1e-11)
        length = float(solution.correlation_length())
        assert in_q(form.correlation_length, point)(q) == pytest.approx(length, rel=1e-11)
        for r in range(4):
            expected = float(np.asarray(solution.correlation("m", "m", [r]))[0])
            assert in_q(form.correlation("m", r=r), point)(q) == pytest.approx(expected, rel=1e-10)


def test_bonds_as_observables():
    form = FIELD
    point = {J: sp.Rational(7, 10), H: sp.Rational(2, 5), BETA: 1, Q: 4}
    reference = potts(q=4)
    solution = solve(reference.at(J="0.7", h="0.4", T=1))
    assert float(form.mean("e").subs(point)) == pytest.approx(float(solution.mean("e")), rel=1e-11)
    got = float(form.susceptibility("e", "m").subs(point))
    assert got == pytest.approx(float(solution.susceptibility("e", "m")), rel=1e-10)
    assert float(-form.derivative("J").subs(point)) == pytest.approx(float(solution.mean("e")), rel=1e-11)


def test_three_real_roots_in_two_fields():
    """The block of symmetric functions is reversible for every q, so that its cubic is solved in cosines."""
    fields = site(lambda s, h: -h * (s == 0) - 2 * h * (s == 1))
    chain = Chain(
        colours("q", special=(0, 1)),
        [bond(lambda s, t, J: -J * (s == t)), fields],
        observables={"m": lambda s: int(s == 0)},
    )
    form = closed_form(chain.fix(J=1, h=1))
    assert form.is_closed and form.eigenvalues[0][0].has(sp.cos)
    solution = solve(plain_chain(chain, 5).at(J=1, h=1, T="0.9"))
    for formula, number in (
        (form.free_energy, solution.free_energy),
        (form.correlation_length, solution.correlation_length()),
        (form.mean("m"), solution.mean("m")),
    ):
        assert in_q(formula, {"T": Fraction(9, 10)})(5) == pytest.approx(float(number), rel=1e-11)
    assert inserted_colour_matrices(form.chain, "m", "m").matrix.is_reversible


def test_observables_without_a_closed_form():
    """The largest root has no radicals; its means are formulas in lambda."""
    chain = Chain(
        colours("q", special=(0,)),
        [*next_nearest().terms, site(lambda s, h: -h * (s == 0))],
        observables={"m": lambda s: int(s == 0), "far": bond(lambda s, t: 2 * (s == t), shift=2)},
    )
    form = closed_form(chain)
    assert not form.is_closed
    values = values_of(chain, 5)
    solution = solve(plain_chain(chain, 4).at(**values))
    root = sp.Float(math.exp(-float(solution.free_energy) / float(values["T"])), 17)
    point = substitution(values, 4) | {sp.Symbol("lambda"): root}
    for name in ("m", "far"):
        assert float(form.mean(name).subs(point).evalf(15)) == pytest.approx(float(solution.mean(name)), rel=1e-8)


def test_fixed_parameters_and_temperature_are_exact_numbers():
    form = closed_form(potts().fix(J="1/3", h=0, T="1/2"))
    assert form.free_energy == -sp.log(Q + sp.exp(sp.Rational(2, 3)) - 1) / 2
    assert float(form.partition_function(6).subs(Q, 3)) == pytest.approx(
        math.exp(float(ring(potts_chain(3).at(J="1/3", h=0, T="1/2"), 6).log_Z)), rel=1e-12
    )


def test_the_largest_eigenvalue_is_that_of_the_symmetric_block(forms):
    """Also for an antiferromagnet, where other blocks have moduli close to it."""
    values = {"J": Fraction(-3), "K": Fraction(-5, 2), "T": Fraction(1)}
    largest = in_q(forms("ladder").eigenvalues[0][0], values)
    for q in (3, 5):
        assert largest(q) == pytest.approx(max(abs(np.linalg.eigvals(plain_matrix(ladder(), q, values)))), rel=1e-10)


# --- proof-reading and refusals


def test_a_wrong_form_is_found_out():
    chain = FIELD.chain
    matrix = colour_matrix(chain)
    right = FIELD.eigenvalues
    assert colour_mismatch(chain, matrix, right, right[0][0]) is None
    for wrong in (
        [*right[:2], (right[2][0], Q - 1)],
        [*right[:2], (right[2][0] + sp.Rational(1, 10**6), Q - 2)],
        [right[0], (-right[1][0], 1), right[2]],
    ):
        assert "power sum of order" in colour_mismatch(chain, matrix, wrong, right[0][0])
    assert "largest eigenvalue" in colour_mismatch(chain, matrix, right, right[1][0])


def test_functions_that_take_symbols_only_are_proof_read_too():
    """T ln 3 as an energy is a weight of 1/3; sympy's logarithm of a number times a float is no number to NumPy."""
    field = site(lambda s, T: -T * sp.log(3) * int(s == 0))
    form = closed_form(Chain(colours("q", special=(0,)), [bond(lambda s, t, J: -J * (s == t)), field]))
    assert form.is_closed
    x = sp.exp(BETA * J)
    first, second = (value for value, m in form.eigenvalues if m == 1)
    assert sp.expand(first + second - 4 * x - Q + 2) == 0
    assert sp.expand(first * second - 3 * (x**2 + (Q - 2) * x - Q + 1)) == 0


@pytest.mark.parametrize("q", [2, 4])
def test_matrices_from_numbers_and_from_symbols_are_the_same(q):
    values = values_of(FIELD.chain, 8)
    numbers = plain_matrix(FIELD.chain, q, values)
    assert from_symbols(plain_chain(FIELD.chain, q), values) == pytest.approx(numbers, rel=1e-12)


def test_what_has_no_meaning_for_a_symbol_is_refused():
    form = FIELD
    refused(NotApplicable, lambda: form.matrix, "of q colours has q rows", ".blocks", "give a number of colours")
    refused(ParameterError, lambda: form.derivative("q"), "no free parameter 'q'; this form depends on J, h, T")
    two = Chain({"a": colours("p"), "b": colours("q")}, [bond(lambda s, t, J: -J * (s == t), ("a", "a"))])
    refused(
        NotApplicable, lambda: closed_form(two), "2 symbols for numbers of colours (p, q)", "give the others a number"
    )


def test_the_text_says_for_which_numbers_of_colours_all_eigenvalues_are_there(forms):
    assert "transfer matrix q x q; beta = 1/T; q whole, at least 3" in str(FIELD)
    assert "1 x 1, q - 2 times: representation (q - 2, 1) of q - 1 colours" in str(FIELD)
    assert "transfer matrix q**2 x q**2; beta = 1/T; q whole, at least 4" in str(forms("next nearest"))


# --- open chains


@pytest.mark.parametrize("name", [name for name in ZOO if name not in ("third neighbours", "sites alone")])
def test_open_chains_equal_those_of_given_numbers_of_colours(name, forms):
    chain, form = ZOO[name], forms(name)
    values = values_of(chain, 3)
    for cells in (1, 2, 4 if "ladder" not in name else 3):
        formula = in_q(form.open_partition_function(cells), values)
        for q in (2, 3, 4):
            numbers = plain_chain(chain, q).at(**values)
            if formula(q) == 0:  # the next-nearest hard core with two colours: no configuration at all
                refused(SolveError, lambda n=cells, at=numbers: open_chain(at, n), "forbidden")
            else:
                assert formula(q) == pytest.approx(math.exp(float(open_chain(numbers, cells).log_Z)), rel=1e-10)


def test_open_chains_as_formulas():
    """The chromatic polynomials of a path, and of a path with every two neighbours' ends joined; from memory."""
    assert ZERO.open_partition_function() == Q * (sp.exp(BETA * J) + Q - 1) ** (N - 1)
    path = closed_form(colouring(1)).open_partition_function()
    assert sp.simplify(path - Q * (Q - 1) ** (N - 1)) == 0
    triangles = SQUARE.open_partition_function()
    assert all(sp.expand(triangles.subs(N, n) - Q * (Q - 1) * (Q - 2) ** (n - 2)) == 0 for n in (2, 3, 5))
    assert triangles.subs(N, 1) == Q
    field = FIELD.open_partition_function().subs(N, 6)
    values = values_of(FIELD.chain, 4)
    expected = math.exp(float(open_chain(plain_chain(FIELD.chain, 5).at(**values), 6).log_Z))
    assert float(field.subs(substitution(values, 5))) == pytest.approx(expected, rel=1e-10)


# --- verbs that need a number


@pytest.mark.parametrize(
    "act",
    [
        lambda chain: solve(chain.at(T=1)),
        lambda chain: ring(chain.at(T=1), 5),
        lambda chain: open_chain(chain.at(T=1), 5),
        lambda chain: certify(chain.at(T=1), 20),
        ground_state,
        lambda chain: scan(chain, axes={"T": [0.5, 1]}, read=["free_energy"]),
        lambda chain: crossovers(chain, along="T", between=(0.1, 2)),
        lambda chain: phase_diagram(potts(), axes=("J", "h"), box={"J": (-1, 1), "h": (-1, 1)}),
        lambda chain: chain.at(T=[1, 2]),
    ],
)
def test_verbs_of_numbers_say_how_to_give_one(act):
    refused(
        NotApplicable,
        lambda: act(potts().fix(J=1, h=0)),
        "sites of kind 's' have q colours, q being a symbol; that is for closed forms",
        "declare the chain with colours(3)",
        "models.load('potts', q=3) and --option q=3 on the command line",
    )


def test_describe_works():
    text = str(describe(ZOO["with spins"]))
    assert "s with 2 states (-1, 1), c with q states (other)" in text
    assert "Transfer matrix 2·q×2·q per cell, 4·q^2 non-zeros" in text
    assert "any permutation of the q colours" in text
    described = describe(potts())
    assert described.matrix == ("q", "q") and described.nonzeros == "q^2" and described.cut == ("s[n]",)
    assert described.symmetries == ("any permutation of the q colours other than 0",)
    assert describe(ZOO["third neighbours"]).matrix == ("q^3", "q^3")
