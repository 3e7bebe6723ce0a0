"""``tmsolve derive``."""

import math

import pytest
import sympy as sp


def read(text):
    """Read a formula back; beta is a function of sympy's own, E and I would be constants."""
    names = ("beta", "J", "D", "h", "J1", "J2")
    return sp.sympify(text, locals={name: sp.Symbol(name) for name in names})


def test_potts_partition_function_reads_as_in_a_book(tm):
    ended = tm("derive", "potts", "--option", "q=3", "-p", "h=0")
    assert ended.code == 0 and ended.err == ""
    assert "Z_N = (exp(beta*J) + 2)**N + 2*(exp(beta*J) - 1)**N" in ended.out
    assert "f = -log(exp(beta*J) + 2)/beta" in ended.out


def test_blume_capel_has_three_eigenvalues_in_real_radicals(tm):
    document = tm("derive", "blume_capel", "-p", "h=0", "--json").json
    values = [read(entry["value"]) for entry in document["quantities"]["eigenvalues"]]
    assert [entry["multiplicity"] for entry in document["quantities"]["eigenvalues"]] == [1, 1, 1]
    assert not any(value.has(sp.I, sp.Piecewise) for value in values)
    point = {sp.Symbol("beta"): 1.3, sp.Symbol("J"): 0.7, sp.Symbol("D"): 0.4}
    y = math.exp(-1.3 * 0.4)
    a = 2 * y * math.cosh(1.3 * 0.7)
    root = math.sqrt((1 - a) ** 2 + 8 * y)
    expected = sorted([(1 + a + root) / 2, (1 + a - root) / 2, 2 * y * math.sinh(1.3 * 0.7)])
    assert sorted(float(value.subs(point)) for value in values) == pytest.approx(expected, rel=1e-12)


def test_quantities_are_formulas_of_the_same_physics_as_solve(tm):
    asked = "f,u,s,c,xi,mean(m),chi(m),derivative(h)"
    document = tm("derive", "ising", "--quantity", asked, "--json").json
    numbers = tm("solve", "ising", "-p", "J=0.7", "-p", "h=0.3", "-p", "T=0.9", "--json").json["results"]
    point = {sp.Symbol("beta"): 1 / 0.9, sp.Symbol("J"): 0.7, sp.Symbol("h"): 0.3}
    for short, long in {
        "f": "free_energy",
        "u": "internal_energy",
        "s": "entropy",
        "c": "specific_heat",
        "xi": "correlation_length",
        "mean(m)": "mean(m)",
        "chi(m)": "susceptibility(m)",
    }.items():
        formula = read(document["quantities"][short])
        assert float(formula.subs(point)) == pytest.approx(numbers[long], rel=1e-10), short
    slope = read(document["quantities"]["derivative(h)"])
    assert float(slope.subs(point)) == pytest.approx(-numbers["mean(m)"], rel=1e-10)


def test_long_names_do_as_well(tm):
    short = tm("derive", "potts", "-p", "h=0", "--quantity", "f,xi").out
    assert short == tm("derive", "potts", "-p", "h=0", "--quantity", "free_energy,correlation_length").out
    assert short.splitlines()[-2].startswith("f = ") and short.splitlines()[-1].startswith("xi = ")


def test_lists_and_matrices(tm):
    out = tm("derive", "lattice_gas", "--quantity", "matrix,blocks,recurrence,polynomial,eigenvalues").out
    assert "transfer matrix\n  1 " in out
    assert "Z_N = c_1 Z_(N-1) + c_2 Z_(N-2)  for N > 2\n  c_1 = 1\n  c_2 = exp(beta*mu)" in out
    assert "det(lambda - M) = lambda**2 - lambda - exp(beta*mu)" in out
    assert "eigenvalues (multiplicity)" in out and "2 x 2, 1 times" in out


def test_a_ring_of_given_length_is_an_exact_sum(tm):
    out = tm("derive", "ising", "-p", "h=0", "--cells", "3").out
    assert "Z_3 = 2*exp(3*beta*J) + 6*exp(-beta*J)" in out
    only = tm("derive", "ising", "-p", "h=0", "--cells", "3", "--quantity", "Z").out
    assert only.rstrip().splitlines()[-1] == "Z_3 = 2*exp(3*beta*J) + 6*exp(-beta*J)"


def test_latex_is_nothing_but_equations(tm):
    lines = tm("derive", "potts", "-p", "h=0", "--latex").out.splitlines()
    assert lines[0] == r"\lambda_{1} = e^{\beta J} + 2"
    assert lines[1] == r"\lambda_{2} = e^{\beta J} - 1 \quad \text{(2 times)}"
    assert lines[2] == (r"Z_{N} = \left(e^{\beta J} + 2\right)^{N} + 2 \left(e^{\beta J} - 1\right)^{N}")
    assert lines[3].startswith("f = - ")
    rest = tm("derive", "lattice_gas", "--latex", "--quantity", "matrix,recurrence,blocks").out
    assert r"M = \left[\begin{matrix}1 & e^{\beta \mu}\\1 & 0\end{matrix}\right]" in rest
    assert r"c_{2} = e^{\beta \mu}" in rest and r"M \simeq 1 \times [2 \times 2]" in rest


def test_fixed_parameters_are_exact_and_defaults_are_not_used(tm):
    document = tm("derive", "blume_capel", "-p", "h=0", "-p", "D=2/5", "--json").json
    assert document["fixed"] == {"h": "0", "D": "2/5"}
    assert document["symbols"] == ["J", "beta"]
    assert "2*beta/5" in document["quantities"]["f"] or "exp(-2*beta/5)" in document["quantities"]["f"]
    assert "(default)" not in tm("derive", "blume_capel", "-p", "h=0").out


def test_without_closed_form_it_says_so_and_gives_the_recurrence(tm):
    ended = tm("derive", "spin1_nnn")
    assert ended.code == 0
    assert "no closed form: " in ended.out and "irreducible factor of degree 9" in ended.out
    assert "c_1 = 2*exp(beta*(-D + J1 + J2))*cosh(beta*h) + 1" in ended.out
    assert "see the attribute" not in ended.out and "--quantity prints it" in ended.out
    document = tm("derive", "spin1_nnn", "--json").json
    assert document["closed"] is False and len(document["quantities"]["recurrence"]) == 9


def test_what_cannot_be_derived_is_told_and_the_rest_is_printed(tm):
    ended = tm("derive", "spin1_nnn", "--quantity", "recurrence,xi")
    assert ended.code == 3
    assert "xi failed: the correlation length needs all eigenvalues" in ended.err
    assert "c_9 = " in ended.out
    alone = tm("derive", "spin1_nnn", "--quantity", "Z")
    assert alone.code == 1 and alone.out == ""
    assert "no closed form of Z_N for symbolic N" in alone.err
    assert "Use --cells 12 for a given number of cells, --quantity recurrence, or" in alone.err


def test_the_time_limit_ends_the_derivation(tm):
    ended = tm("derive", "clock", "--option", "q=12", "--time-limit", "0.001")
    assert ended.code == 1
    assert "time limit of 0.001 s; use tmsolve solve for numbers, or give a longer --time-limit" in ended.err


def test_the_name_of_an_observable_is_its_mean(tm):
    assert "<m> = " in tm("derive", "ising", "--quantity", "m").out
    assert tm("derive", "ising", "--quantity", "chi").out == tm("derive", "ising", "--quantity", "chi(m)").out


def test_correlation_function_at_a_symbolic_distance(tm):
    # Textbook (E. Ising 1925 and later): tanh(K)**r at h = 0.
    assert "<m; r> = tanh(beta*J)**r" in tm("derive", "ising", "-p", "h=0", "--quantity", "corr(m)").out


def test_open_chains(tm):
    out = tm("derive", "ising", "-p", "h=0", "--quantity", "Z", "--open").out
    assert "Z_N = 2*(2*cosh(beta*J))**(N - 1)" in out
    assert "Z_2 = 2*exp(beta*J) + 2*exp(-beta*J)" in tm("derive", "ising", "-p", "h=0", "--open", "--cells", "2").out


def test_series_with_and_without_a_closed_form(tm):
    out = tm("derive", "ising", "-p", "h=0", "--quantity", "series(c)", "--order", "4").out
    # c = K² sech² K = K² − K⁴ + …
    assert "c = beta**2*J**2 - beta**4*J**4 + O(beta**5)" in out
    document = tm("derive", "spin1_nnn", "-p", "h=0", "--quantity", "series", "--order", "2", "--json").json
    assert document["quantities"]["series(free_energy)"]["terms"][0] == {
        "coefficient": "-log(3)",
        "power": "-1",
        "energy": "0",
    }
    low = tm("derive", "ising", "-p", "J=-1", "-p", "h=2", "--quantity", "series(entropy)", "--about", "low").out
    assert "log(1/2 + sqrt(5)/2)" in low


def test_limits_say_what_to_fix(tm):
    out = tm("derive", "ising", "--quantity", "limits").out
    assert "-p J=… -p h=…" in out and "T -> infinity" in out


def test_counts_are_exact_and_need_a_length(tm):
    ended = tm("derive", "ising", "-p", "J=1", "-p", "h=0", "--quantity", "counts", "--cells", "4")
    assert ended.out.split()[-6:] == ["-4", "2", "0", "12", "4", "2"]
    refused = tm("derive", "ising", "--quantity", "counts")
    assert refused.code == 2 and "add --cells N" in refused.err
    document = tm("derive", "ising", "--quantity", "counts(m)", "--cells", "3", "--open", "--json").json
    assert document["quantities"]["counts(m)"] == {
        "names": ["m"],
        "counts": [["-3", "1"], ["-1", "3"], ["1", "3"], ["3", "1"]],
    }


def test_generating_function(tm):
    # Σ (2 cosh K)ᴺ xᴺ + Σ (2 sinh K)ᴺ xᴺ
    text = tm("derive", "ising", "-p", "h=0", "--quantity", "generating", "--json").json["quantities"]["generating"]
    x, J, beta = sp.symbols("x J beta")
    a, b = 2 * sp.cosh(J * beta) * x, 2 * sp.sinh(J * beta) * x
    difference = sp.sympify(text, locals={"beta": beta}) - a / (1 - a) - b / (1 - b)
    assert abs(difference.subs({x: 0.13, J: 0.7, beta: 0.9}).evalf()) < 1e-13


def test_a_symbolic_number_of_colours(tm):
    # F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982).
    out = tm("derive", "potts", "--option", "q=q", "-p", "h=0").out
    assert "Z_N = (q + exp(beta*J) - 1)**N + (q - 1)*(exp(beta*J) - 1)**N" in out


@pytest.mark.parametrize(
    ("asked", "text"),
    [
        ("corr(k)", "corr(k): no observable 'k'; there are m"),
        ("chi(m,m,m)", "chi takes one or two observables in brackets, got 'chi(m,m,m)'"),
        ("free_energi", "Did you mean 'free_energy'?"),
        ("f(m)", "f takes nothing in brackets, got 'f(m)'"),
    ],
)
def test_wrong_names(tm, asked, text):
    refused = tm("derive", "ising", "--quantity", asked)
    assert refused.code == 2 and text in refused.err


def test_zeros_lie_on_the_unit_circle_and_are_drawn(tm, tmp_path):
    # T. D. Lee and C. N. Yang, Phys. Rev. 87, 410 (1952).
    pytest.importorskip("matplotlib")
    path = tmp_path / "zeros.png"
    words = ["derive", "ising", "-p", "J=1", "-p", "T=2", "--cells", "6", "--quantity", "zeros", "--json"]
    document = tm(*words, "--plot", str(path)).json
    found = document["quantities"]["zeros(h)"]
    assert found["variable"] == "z = exp(-2*beta*h)" and len(found["zeros"]) == 6
    for real, imaginary, times in found["zeros"]:
        assert times == 1 and abs(sp.Float(real, 40) ** 2 + sp.Float(imaginary, 40) ** 2 - 1) < 1e-29
    assert path.stat().st_size > 5000
    refused = tm("derive", "ising", "--quantity", "f", "--plot", str(path))
    assert refused.code == 2 and "--plot draws zeros" in refused.err


def test_numpy_text_runs_alone(tm, tmp_path):
    text = tm("derive", "blume_capel", "-p", "h=0", "--quantity", "c", "--numpy").out
    space = {}
    exec(compile(text, "printed", "exec"), space)
    answer = tm("solve", "blume_capel", "-p", "J=1", "-p", "D=0.9", "-p", "h=0", "-p", "T=0.2", "--json").json
    assert float(space["specific_heat"](0.2, 1.0, 0.9)) == pytest.approx(answer["results"]["specific_heat"], rel=1e-12)
    refused = tm("derive", "ising", "--quantity", "Z", "--numpy")
    assert refused.code == 2 and "--numpy writes f, u, s, c, xi" in refused.err


def test_mathml_is_well_formed(tm):
    from xml.etree import ElementTree

    out = tm("derive", "ising", "-p", "h=0", "--quantity", "f,chi(m)", "--mathml").out
    elements = [ElementTree.fromstring(line) for line in out.splitlines()]
    assert [element.tag for element in elements] == ["{http://www.w3.org/1998/Math/MathML}math"] * 2
    refused = tm("derive", "ising", "--quantity", "blocks", "--mathml")
    assert refused.code == 2 and "writes single formulas" in refused.err


def test_no_empty_list_of_eigenvalues(tm):
    done = tm("derive", "ising_nnn", "--quantity", "eigenvalues")
    assert done.code == 1 and "not every eigenvalue is known" in done.err and "--quantity polynomial" in done.err
