"""What happens where there is no closed form, too little time, or a question without meaning."""

from __future__ import annotations

import math
import threading
import time

import mpmath as mp
import pytest
import sympy as sp

from tests.laws.enumeration import Enumeration
from tests.symbolic.evaluation import ising_chain, ladder, next_nearest_chain, next_nearest_spin1, potts_chain, symbol
from tmsolve import (
    Chain,
    NotApplicable,
    ParameterError,
    SolveError,
    StateSet,
    TooLargeError,
    bond,
    closed_form,
    ising,
    site,
    spins,
)
from tmsolve.symbolic import forms
from tmsolve.symbolic.verify import evaluate

#: What a busy machine may add to a time limit.
SLACK = 20.0  # a busy machine is slow to hand the processor back; a hang is what would be wrong
BETA = sp.Symbol("beta", positive=True)


def cylinder(legs: int) -> Chain:
    """Ising spins on a ring of legs, in a field: 2^legs states and few symmetries."""
    kinds = [f"leg{i}" for i in range(legs)]
    along = [bond(lambda s, t, J: -J * s * t, (k, k), shift=1) for k in kinds]
    around = [bond(lambda s, t, R: -R * s * t, (kinds[i], kinds[(i + 1) % legs]), shift=0) for i in range(legs)]
    return Chain({k: ising() for k in kinds}, [*along, *around, site(lambda s, h: -h * s)])


def spin1_of_range_three() -> Chain:
    """27 states, four parameters."""
    return Chain(
        spins(1),
        [
            bond(lambda s, t, J1: -J1 * s * t),
            bond(lambda s, t, J3: -J3 * s * t, shift=3),
            site(lambda s, D, h: D * s * s - h * s),
        ],
    )


# --- implicit forms and recurrences


def test_next_nearest_spin_1_in_a_field_has_a_recurrence():
    start = time.monotonic()
    form = closed_form(next_nearest_spin1(), time_limit=30)
    assert time.monotonic() - start < 30 + SLACK
    assert not form.is_closed and form.eigenvalues == []
    assert "irreducible factor of degree 9" in form.why and "implicit form" in form.why
    assert len(form.recurrence) == 9
    assert [(b.size, b.multiplicity) for b in form.blocks] == [(9, 1)]
    assert sp.degree(form.characteristic_polynomial, sp.Symbol("lambda")) == 9
    values = {"J1": "0.7", "J2": "-0.3", "D": "0.4", "h": "0.2", "T": "1.1"}
    point = {symbol(k): sp.Rational(v) for k, v in values.items() if k != "T"} | {BETA: 1 / sp.Rational("1.1")}
    for cells in (3, 5):
        expected = Enumeration(next_nearest_spin1(), values, cells, ring=True).log_z
        assert math.isclose(float(mp.log(evaluate(form.partition_function(cells), point))), expected, rel_tol=1e-12)


def test_without_a_form_the_questions_say_so():
    form = closed_form(next_nearest_chain())
    with pytest.raises(
        NotApplicable, match=r"no closed form of Z_N for symbolic N: .*degree 4.*partition_function\(12\)"
    ):
        form.partition_function()
    with pytest.raises(NotApplicable, match="correlation length needs all eigenvalues"):
        form.correlation_length
    assert form.free_energy == -sp.log(sp.Symbol("lambda")) / BETA
    assert "lambda" in {s.name for s in form.mean("m").free_symbols}
    text = str(form)
    assert (
        "no closed form" in text
        and "det(lambda - M) = lambda**4 - 2*lambda**3*exp(beta*(J1 + J2))*cosh(beta*h)" in text
    )
    assert "Z_N = sum of c_k Z_(N-k), k = 1 ... 4" in text and "c_1 = 2*exp(beta*(J1 + J2))*cosh(beta*h)" in text
    assert r"\det(\lambda - M)" in form._repr_latex_()


def test_a_solved_block_gives_the_free_energy_though_another_has_no_form():
    """The block of the largest eigenvalue is solved, one of the others is not: f is closed, Z_N is not."""
    chain = Chain(
        StateSet([0, 1, 2, 3, 4, 5, 6, 7]),
        [bond(lambda s, t, J, K: -J * (s == t) - K * ((t - s) % 8 in (1, 3)))],
    )
    form = closed_form(chain)
    J, K = sp.symbols("J K", real=True)
    assert form.free_energy == -sp.log(sp.exp(BETA * J) + 2 * sp.exp(BETA * K) + 5) / BETA


# --- the time limit


@pytest.mark.parametrize("limit", [0.3, 1.5, 4])
@pytest.mark.parametrize("chain", [spin1_of_range_three(), cylinder(5)], ids=["range 3", "cylinder"])
def test_the_time_limit_is_kept(chain, limit):
    start = time.monotonic()
    try:
        form = closed_form(chain, time_limit=limit)
    except TooLargeError as error:
        assert "time limit" in str(error) and "solve(chain.at(…))" in str(error)
    else:
        assert not form.is_closed
        assert "took longer than" in form.why
    assert time.monotonic() - start < limit + SLACK


def test_the_time_limit_is_kept_in_another_thread():
    took = []

    def work():
        start = time.monotonic()
        form = closed_form(spin1_of_range_three(), time_limit=1.5)
        took.append((time.monotonic() - start, form.is_closed))

    thread = threading.Thread(target=work)
    thread.start()
    thread.join()
    assert took[0][0] < 1.5 + SLACK and not took[0][1]


def test_the_matrix_alone_still_gives_rings():
    form = closed_form(spin1_of_range_three(), time_limit=1.5)
    assert "only the matrix is known" in form.why
    with pytest.raises(NotApplicable, match="the recurrence is not known"):
        form.recurrence
    with pytest.raises(NotApplicable, match="largest eigenvalue is not known"):
        form.free_energy
    values = {"J1": "0.7", "J3": "-0.3", "D": "0.4", "h": "0.2", "T": "1"}
    point = {symbol(k): sp.Rational(v) for k, v in values.items() if k != "T"} | {BETA: 1}
    patient = forms.ClosedForm(form.chain, False, form.why, 60, form.spectrum)
    expected = Enumeration(form.chain, values, 4, ring=True).log_z
    assert math.isclose(float(mp.log(evaluate(patient.partition_function(4), point))), expected, rel_tol=1e-12)


def test_later_questions_have_the_limit_too():
    form = closed_form(next_nearest_spin1(), time_limit=2)
    start = time.monotonic()
    with pytest.raises(SolveError, match=r"not finished within 2 s.*chain\.fix"):
        form.susceptibility("m")
    with pytest.raises(TooLargeError, match="Z_60 of this chain was not expanded within 2 s"):
        form.partition_function(60)
    assert time.monotonic() - start < 2 * (2 + SLACK)


def test_a_form_that_was_not_proof_read_is_withheld(monkeypatch):
    def slow(*_):
        while True:
            pass

    monkeypatch.setattr(forms, "mismatch", slow)
    form = closed_form(ising_chain(), time_limit=1)
    assert not form.is_closed and "was not checked against the matrix in time" in form.why
    assert form.eigenvalues == [] and len(form.recurrence) == 2


def test_a_wrong_branch_is_an_error(monkeypatch):
    h, J = sp.symbols("h J", real=True)
    wrong = sp.exp(BETA * J) * sp.cosh(BETA * h)
    monkeypatch.setattr(forms, "ordered_eigenvalues", lambda *_: [(wrong, 1), (wrong / 2, 1)])
    with pytest.raises(SolveError, match="does not reproduce its matrix: the power sum of order 1"):
        closed_form(ising_chain())


@pytest.mark.parametrize("limit", [0, -1, math.inf, math.nan, "soon", None])
def test_limits_that_are_none(limit):
    with pytest.raises(ParameterError, match="time_limit is a positive number of seconds"):
        closed_form(ising_chain(), time_limit=limit)


# --- numbers that make high powers


def test_decimals_as_parameters_end_soon():
    """Fixed decimals make exp(-0.001 β) the unit; nothing may be factored in powers of thousands."""
    start = time.monotonic()
    form = closed_form(next_nearest_spin1().fix(J1="1.131", J2="-0.417", D="0.213", h="0.371"))
    assert not form.is_closed and len(form.recurrence) == 9
    form = closed_form(potts_chain(3).fix(J="1.131", h="0.371"))
    assert form.is_closed and form.mean("m").free_symbols == {BETA}
    assert time.monotonic() - start < 30 + SLACK


# --- rings


@pytest.mark.parametrize("cells", [0, -1, 2, 1])
def test_rings_shorter_than_a_bond(cells):
    form = closed_form(next_nearest_chain().fix(h=0))
    with pytest.raises(NotApplicable, match="spans 2 cells; use at least 3 cells"):
        form.partition_function(cells)


@pytest.mark.parametrize("cells", [2.5, "7", sp.Symbol("N")])
def test_cells_are_counted_in_whole_numbers(cells):
    with pytest.raises(NotApplicable, match="the number of cells must be a whole number"):
        closed_form(ising_chain()).partition_function(cells)


# --- names


def test_unknown_names():
    form = closed_form(ising_chain().fix(h=0))
    with pytest.raises(ParameterError, match=r"no observable 'M'.*Did you mean 'm'"):
        form.mean("M")
    with pytest.raises(ParameterError, match="no observable 'q'"):
        form.susceptibility("m", "q")
    with pytest.raises(ParameterError, match=r"no free parameter 'j'; this form depends on J, T\. Did you mean 'J'"):
        form.derivative("j")
    with pytest.raises(ParameterError, match=r"no free parameter 'h'.*It is fixed"):
        form.derivative("h")


def test_a_fixed_temperature():
    form = closed_form(ising_chain().fix(T=2, h=0))
    J = sp.Symbol("J", real=True)
    assert form.free_energy == -2 * sp.log(2 * sp.cosh(J / 2))
    assert (
        form.derivative("J") == -sp.tanh(J / 2)
        or (form.derivative("J") + sp.tanh(J / 2)).rewrite(sp.exp).simplify() == 0
    )
    for quantity in ("internal_energy", "entropy", "specific_heat"):
        with pytest.raises(NotApplicable, match="differentiates by T, which is fixed"):
            getattr(form, quantity)
    with pytest.raises(ParameterError, match="no free parameter 'T'"):
        form.derivative("T")
    assert "T = 2" in str(form)


# --- chains with structure


def test_all_configurations_forbidden():
    with pytest.raises(NotApplicable, match="every configuration of this chain is forbidden"):
        closed_form(Chain(ising(), [bond(lambda s, t: math.inf)]))


def test_classes_that_never_meet():
    """Two states that never change: λ = 1 or e^βh, whichever is larger; no one formula for a derivative."""
    chain = Chain(
        StateSet([0, 1]),
        [bond(lambda s, t: math.inf if s != t else 0), site(lambda s, h: -h * s)],
        observables={"m": lambda s: s},
    )
    form = closed_form(chain)
    h = sp.Symbol("h", real=True)
    assert form.is_closed
    assert form.free_energy == -sp.log(sp.Max(1, sp.exp(BETA * h))) / BETA
    assert form.partition_function(4) == 1 + sp.exp(4 * BETA * h)
    for ask in (lambda: form.internal_energy, lambda: form.mean("m"), lambda: form.correlation_length):
        with pytest.raises(NotApplicable, match="classes that do not reach each other"):
            ask()


def test_transient_states_do_not_matter():
    """0 can be left and never reached again; the rest is a chain of its own."""
    energies = {(0, 0): 3, (0, 1): 0, (1, 1): 0, (1, 2): 1, (2, 1): 1, (2, 2): 0}
    chain = Chain(
        StateSet([0, 1, 2]),
        [bond(lambda s, t, J: J * energies[s, t] if (s, t) in energies else math.inf)],
        observables={"zero": lambda s: int(s == 0), "two": lambda s: int(s == 2)},
    )
    form = closed_form(chain.fix(J=1))
    assert form.free_energy == -sp.log(1 + sp.exp(-BETA)) / BETA
    assert form.mean("zero") == 0 and form.mean("two") == sp.Rational(1, 2)


def test_a_chain_of_period_two():
    chain = Chain(StateSet(["a", "b"]), [bond(lambda s, t, J: math.inf if s == t else -J)])
    form = closed_form(chain)
    assert form.partition_function(5) == 0
    assert form.correlation_length == sp.oo


def test_no_bond_at_all():
    form = closed_form(Chain(spins(1), [site(lambda s, D: D * s * s)], observables={"q": lambda s: s * s}))
    D = sp.Symbol("D", real=True)
    assert form.eigenvalues == [(1 + 2 * sp.exp(-BETA * D), 1)]
    assert form.correlation_length == 0
    assert (form.mean("q") - 2 / (sp.exp(BETA * D) + 2)).simplify() == 0


def test_no_parameters_at_all():
    form = closed_form(Chain(ising(), [bond(lambda s, t: 0)]))
    assert form.partition_function(5) == 32 and form.entropy == sp.log(2) and form.internal_energy == 0


def test_an_observable_wider_than_the_matrix():
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: -J * s * t)],
        observables={"far": bond(lambda s, t: s * t, shift=2)},
    )
    form = closed_form(chain)
    J = sp.Symbol("J", real=True)
    assert (form.mean("far") - sp.tanh(BETA * J) ** 2).rewrite(sp.exp).simplify() == 0


# --- how it shows itself


def test_text_and_latex():
    form = closed_form(potts_chain(3).fix(h=0))
    text = str(form)
    assert "Z_N = (exp(beta*J) + 2)**N + 2*(exp(beta*J) - 1)**N" in text
    assert "f = -log(exp(beta*J) + 2)/beta" in text
    assert "1 x 1, 2 times: standard representation of the permutations of the 3 states" in text
    assert repr(form) == "<ClosedForm of 'chain': closed form, 3 x 3>"
    assert form._repr_latex_() == (
        r"$\displaystyle Z_{N} = \left(e^{\beta J} + 2\right)^{N} + 2 \left(e^{\beta J} - 1\right)^{N}$"
    )


def test_blocks_are_labelled_by_what_they_do():
    labels = [b.label for b in closed_form(ladder()).blocks]
    assert labels[0] == "even under reversal of the states and exchange of a and b"
    assert "odd under reversal of the states, even under exchange of a and b" in labels
