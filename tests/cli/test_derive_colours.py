"""``tmsolve derive`` for a symbolic number of colours, and the other commands on such a model."""

import pytest
import sympy as sp


def read(text):
    return sp.sympify(text, locals={name: sp.Symbol(name) for name in ("beta", "J", "h", "q", "N")})


def test_potts_for_any_number_of_colours(tm):
    """F. Y. Wu, Rev. Mod. Phys. 54, 235 (1982); from memory."""
    ended = tm("derive", "potts", "--option", "q=q", "-p", "h=0")
    assert ended.code == 0 and ended.err == ""
    assert ended.out.startswith("q-state Potts chain (potts, q = q)\n")
    assert "Z_N = (q + exp(beta*J) - 1)**N + (q - 1)*(exp(beta*J) - 1)**N" in ended.out
    assert "exp(beta*J) - 1  (q - 1)" in ended.out
    assert "f = -log(q + exp(beta*J) - 1)/beta" in ended.out
    assert "transfer matrix q x q; beta = 1/T; q whole, at least 2" in ended.out
    assert "1 x 1, q - 1 times: representation (q - 1, 1) of q colours" in ended.out


def test_multiplicities_are_text_in_json_and_brackets_in_latex(tm):
    asked = ("derive", "potts", "--option", "q=q", "-p", "h=0", "--quantity", "eigenvalues,blocks,Z")
    document = tm(*asked, "--json").json
    assert [entry["multiplicity"] for entry in document["quantities"]["eigenvalues"]] == [1, "q - 1"]
    assert [entry["multiplicity"] for entry in document["quantities"]["blocks"]] == [1, "q - 1"]
    assert document["options"] == {"q": "q"}
    formula = read(document["quantities"]["Z"])
    q, x, cells = sp.Symbol("q"), sp.exp(sp.Symbol("beta") * sp.Symbol("J")), sp.Symbol("N")
    assert formula == (x + q - 1) ** cells + (q - 1) * (x - 1) ** cells
    latex = tm(*asked, "--latex").out.splitlines()
    assert latex[1] == r"\lambda_{2} = e^{\beta J} - 1 \quad (q - 1 \text{ times})"
    assert latex[2] == r"M \simeq 1 \times [1 \times 1] \oplus (q - 1) \times [1 \times 1]"
    assert r"+ (q - 1) \left(e^{\beta J} - 1\right)^{N}" in latex[3]


def test_a_ring_of_given_size_and_any_name(tm):
    ended = tm("derive", "potts", "--option", "q=n", "-p", "h=0", "--cells", "3", "--quantity", "Z,mean(m)")
    n, x = sp.Symbol("n"), sp.exp(sp.Symbol("beta") * sp.Symbol("J"))
    lines = ended.out.splitlines()
    Z = read(lines[-2].removeprefix("Z_3 = "))
    assert sp.expand(Z - (x + n - 1) ** 3 - (n - 1) * (x - 1) ** 3) == 0
    assert lines[-1] == "<m> = 1/n"


def test_the_matrix_itself_has_no_size(tm):
    ended = tm("derive", "potts", "--option", "q=q", "--quantity", "matrix")
    assert ended.code == 1
    assert "the transfer matrix of q colours has q rows" in ended.err


@pytest.mark.parametrize(
    "words",
    [
        ("solve",),
        ("ground",),
        ("crossovers", "--along", "T=0.1:2"),
        ("scan", "--axis", "T=0.5:1:3"),
        ("finite", "--cells", "9"),
    ],
)
def test_commands_of_numbers_say_how_to_give_one(tm, words):
    command, *rest = words
    ended = tm(command, "potts", *rest, "--option", "q=q")
    assert ended.code in (1, 2) and ended.out == ""
    assert "sites of kind 's' have q colours, q being a symbol" in ended.err
    assert "--option q=3 on the command line" in ended.err


def test_the_model_is_described(tm):
    ended = tm("models", "potts", "--option", "q=q")
    assert ended.code == 0
    assert "Transfer matrix q×q per cell, q^2 non-zeros" in ended.out


def test_a_number_that_is_neither_whole_nor_a_name(tm):
    ended = tm("derive", "potts", "--option", "q=2.5")
    assert ended.code == 2
    assert "takes a whole number such as 3, or a name for it such as 'q', got '2.5'" in ended.err
