"""Chains whose states fall into classes that do not reach each other."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest
import sympy as sp

from tmsolve.answer.solve import solve
from tmsolve.declare import Chain, StateSet, bond, ising, site, term, weight
from tmsolve.errors import NotApplicable
from tmsolve.symbolic.forms import closed_form

# Covering a strip of width 2: which sites are covered from the left.
STRIP = Chain(
    StateSet([(0, 0), (1, 1), (0, 1), (1, 0)]),
    [weight(lambda a, b, z: z if a == b == (0, 0) else int(all(x + y == 1 for x, y in zip(a, b, strict=True))), 0, 1)],
    {"n": lambda a: a[0] + a[1]},
)
# The number of arrows up is the same in every row.
ARROWS = Chain(
    {"u": ising(), "d": ising()},
    [
        term(
            lambda a, b, c, d, e: (0 if (a, b) == (c, d) else e) if a + b == c + d else math.inf,
            ("u", 0), ("d", 0), ("u", 1), ("d", 1),
        )
    ],
)  # fmt: skip


def frozen(energy):
    return Chain(StateSet([0, 1, 2]), [bond(lambda s, t: 0 if s == t else math.inf), site(energy)], {"m": lambda s: s})


def test_every_class_that_may_lead_is_kept():
    form = closed_form(frozen(lambda s, h, D: D * s**2 - h * s))
    beta = sp.Symbol("beta", positive=True)
    h, D = sp.symbols("h D", real=True)
    # The state in the middle leads only where D < h < 3 D.
    at = form.free_energy.subs({h: 1, D: sp.Rational(1, 2), beta: 1})
    assert sp.nsimplify(at) == sp.Rational(-1, 2)
    assert solve(form.chain.at(T=1, h=1, D="0.5")).free_energy == pytest.approx(-0.5)
    with pytest.raises(NotApplicable, match="classes that do not reach each other"):
        form.mean("m")


def test_a_fixed_field_decides_between_classes():
    form = closed_form(frozen(lambda s, h: -h * s).fix(h=1))
    assert form.free_energy.simplify() == -2
    assert form.mean("m") == 2


@pytest.mark.parametrize(
    ("chain", "values"),
    [(STRIP, {"z": Fraction(7, 10)}), (STRIP, {"z": 3}), (ARROWS, {"e": 1}), (ARROWS, {"e": Fraction(-1, 3)})],
)
def test_length_of_the_class_that_leads(chain, values):
    form = closed_form(chain)
    at = {s: sp.Rational(str(values.get(s.name, 2))) for s in form.correlation_length.free_symbols}
    length = solve(chain.at(T="0.5", **values)).correlation_length()
    assert float(form.correlation_length.subs(at)) == pytest.approx(float(length), rel=1e-12)


def test_powers_of_negative_numbers_are_in_brackets():
    text = str(closed_form(STRIP))
    (line,) = [line for line in text.splitlines() if line.startswith("  Z_N = ")]
    assert line.endswith(" + 1 + (-1)**N")
    for cells in (3, 4):
        value = sp.sympify(line[8:], locals={"N": sp.Integer(cells), "z": sp.Integer(2)})
        exact = closed_form(STRIP).partition_function(cells).subs(sp.Symbol("z", real=True), 2)
        assert sp.expand(value - exact) == 0
