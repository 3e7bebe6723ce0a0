"""MathML of formulas: well formed, and made of the elements that a reader expects."""

import xml.etree.ElementTree as ET

import pytest
import sympy as sp

from tmsolve import Chain, bond, closed_form, ising, models, site
from tmsolve.symbolic.decimation.recursion import recursion
from tmsolve.symbolic.export.mathml import mathml

B = sp.Symbol("beta", positive=True)
J, h, J2, new = (sp.Symbol(name, real=True) for name in ("J", "h", "J2", "J'"))


def tree(expr, **options):
    """Parse, and drop the name space."""
    root = ET.fromstring(mathml(expr, **options))
    for element in root.iter():
        assert element.tag.startswith("{http://www.w3.org/1998/Math/MathML}")
        element.tag = element.tag.partition("}")[2]
    return root


def text(expr, **options):
    """All visible characters in their order, invisible operators dropped."""
    return "".join(tree(expr, **options).itertext()).replace("\u2062", "").replace("\u2061", "")


def test_frame():
    root = tree(J)
    assert root.tag == "math" and root.get("display") == "block"
    assert tree(J, display=False).get("display") is None
    assert text(B * J, left=sp.Symbol("f")) == "f=βJ"


def test_beta_comes_first_and_numbers_before_it():
    assert text(2 * J * B) == "2βJ"
    assert text(-J * B) == "−βJ"
    assert text(B * (J - h)) == "β(J−h)"


def test_minus_is_a_minus_and_e_a_letter():
    root = tree(sp.exp(-B * J) - 2)
    assert next(e.text for e in root.iter("mi")) == "e" and "\u2212" in [e.text for e in root.iter("mo")]
    assert "-" not in "".join(root.itertext()) and "\u2147" not in "".join(root.itertext())
    assert text(-sp.Rational(3, 2)) == "−32" and tree(-sp.Rational(3, 2)).find(".//mfrac") is not None
    assert text(sp.E * J) in ("eJ", "Je")


def test_exponentials_stay_powers():
    root = tree(sp.exp(-B * J))
    assert root.find("mfrac") is None and root.find("msup") is not None
    assert text(J * sp.exp(-B * h)) == "Je−βh"


@pytest.mark.parametrize("function, name", [(sp.sinh, "sinh"), (sp.cosh, "cosh"), (sp.log, "ln"), (sp.acos, "arccos")])
def test_powers_of_functions_stand_at_the_name(function, name):
    root = tree(function(B * h, evaluate=False) ** 2)
    power = root.find(".//msup")
    assert [child.text for child in power] == [name, "2"]
    assert text(function(h, evaluate=False)) == f"{name}(h)"


def test_powers_roots_and_quotients():
    assert [e.tag for e in tree(sp.sqrt(J)).iter()][1] == "msqrt"
    assert [e.tag for e in tree(J ** sp.Rational(1, 3)).iter()][1] == "mroot"
    fraction = tree(1 / sp.sqrt(J)).find("mfrac")
    assert fraction[0].text == "1" and fraction[1].tag == "msqrt"
    assert text((J + h) ** 2) == "(J+h)2" and text((B * J) ** sp.Symbol("N", integer=True)) in ("βNJN", "(βJ)N")
    quotient = tree(sp.log(sp.cosh(2 * B * J)) / (2 * B)).find("mfrac")
    assert "".join(quotient[1].itertext()).replace("\u2062", "") == "2β"
    assert text(sp.Mul(2, sp.Integer(3) ** 2, evaluate=False)) in ("2⋅9", "2⋅32")
    assert text(sp.Abs(J)) == "|J|"


def test_sums_keep_their_signs():
    for expr in (J - h, -J - h, J - (h - J2) * B, h - sp.Mul(-1, J + J2, evaluate=False), -(J + h) * B, 1 - 1 / B):
        written = text(expr)
        assert "+−" not in written and "−−" not in written
    assert text(1 - B * (J - h)) == "−β(J−h)+1"


def test_symbols_have_indices_primes_and_greek_letters():
    sub = tree(J2).find("msub")
    assert sub[0].text == "J" and "".join(sub[1].itertext()) == "2"
    assert text(new) == "J′" and tree(new).find("msup") is not None
    assert tree(sp.Symbol("J2'")).find("msubsup") is not None
    assert text(sp.Symbol("mu")) == "μ" and text(sp.Symbol("lambda")) == "λ" and text(sp.Symbol("field")) == "field"


def test_cases():
    root = tree(sp.Piecewise((J, h > 0), (-J, True)))
    rows = root.findall(".//mtr")
    assert len(rows) == 2 and root.find(".//mo").text == "{"
    assert ["".join(row.itertext()) for row in rows] == ["Jfor\u00a0h>0", "−Jotherwise"]


def test_second_derivatives_have_the_power_at_the_variable():
    f = sp.Function("f")(B, h)
    fraction = tree(sp.Derivative(f, (B, 2), h)).find(".//mfrac")
    above, below = ("".join(part.itertext()) for part in fraction)
    assert (above, below) == ("∂3", "∂β2∂h")
    powers = [["".join(child.itertext()) for child in power] for power in fraction[1].iter("msup")]
    assert powers == [["β", "2"]]


def test_relations_and_matrices_escape_what_xml_reserves():
    assert text(sp.Lt(J, h)) == "J<h" and "&lt;" in mathml(sp.Lt(J, h))
    assert text(sp.Eq(new, J**2)) == "J′=J2"
    root = tree(sp.Matrix([[1, B], [0, -1]]))
    assert len(root.findall(".//mtr")) == 2 and len(root.findall(".//mtd")) == 4
    assert text(sp.Symbol("a<b&c")) == "a<b&c"


def test_what_is_not_known_comes_as_text():
    root = tree(sp.Integral(J * h, h))
    assert root.find("mtext").text == "Integral(J*h, h)"
    assert text(sp.Max(J, h)) in ("max(J,h)", "max(h,J)")


@pytest.mark.parametrize("name, fixed", [("ising", {}), ("blume_capel", {"h": 0}), ("blume_capel", {}), ("potts", {})])
def test_every_formula_of_a_closed_form_is_well_formed(name, fixed):
    form = closed_form(models.load(name).chain.fix(**fixed))
    for expr in (form.free_energy, form.partition_function(), form.matrix, form.eigenvalues[0][0], form.mean("m")):
        root = tree(expr)
        assert root.find(".//mtext") is None
        assert "*" not in "".join(root.itertext())


def test_recursion_relations():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
    for equation in recursion(chain).equations:
        assert "′=" in text(equation)


def test_numbers_next_to_each_other_have_a_dot():
    assert text(sp.Mul(J, 3, evaluate=False)) == "3J"
    assert text(3 * sp.Pow(2, sp.Symbol("N"), evaluate=False)) == "3⋅2N"
