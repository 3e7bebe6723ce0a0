"""Weights that are positive in a part of the space of parameters, and what no formula can follow from."""

from __future__ import annotations

import numpy as np
import pytest

from tmsolve.answer.exported import numpy_function
from tmsolve.answer.solve import solve
from tmsolve.declare import Chain, bond, colours, ising, site, spins, weight
from tmsolve.errors import DeclarationError, NotApplicable
from tmsolve.symbolic.forms import closed_form

PERSISTENT = Chain(
    ising(), [weight(lambda s, t, w: 1 - w if s == t else w, 0, 1), site(lambda s, h: -h * s)], {"m": lambda s: s}
)


def test_a_probability_and_its_complement():
    form = closed_form(PERSISTENT)
    numbers = solve(PERSISTENT.at(T=[0.5, 0.05], w=0.2, h=0.4))
    for name in ("specific_heat", "mean(m)", "correlation_length"):
        function = numpy_function(form, name)
        wanted = getattr(numbers, name.split("(")[0])
        wanted = wanted if name == "specific_heat" else wanted(*(["m"] if "mean" in name else []))
        np.testing.assert_allclose(function(T=[0.5, 0.05], w=0.2, h=0.4), wanted, rtol=1e-10)


def test_a_probability_with_a_symbolic_number_of_colours():
    chain = Chain(colours("q"), [weight(lambda a, b, p: p if a == b else 1 - p, 0, 1)])
    assert [(str(value), str(m)) for value, m in closed_form(chain).eigenvalues] == [
        ("p*(2 - q) + q - 1", "1"),
        ("2*p - 1", "q - 1"),
    ]


@pytest.mark.parametrize(
    ("chain", "error", "words"),
    [
        (
            Chain(ising(), [weight(lambda s, t, w: w if s == t else -1, 0, 1)]),
            DeclarationError,
            r"at states \(-1, 1\) is the weight -1, which is negative; weights are 0 or positive",
        ),
        (
            Chain(ising(), [weight(lambda s, t, w: w - w * w - 1 if s == t else w, 0, 1)]),
            NotApplicable,
            "no values of w were found at which all weights are positive.*chain.fix",
        ),
        (
            Chain(spins(1), [bond(lambda s, t, J, n: -J * abs(s * t) ** n)]),
            DeclarationError,
            r"at states \(-1, 0\) is -0\*\*n\*J, and 0 to the power of a parameter is 0, 1 or infinite",
        ),
    ],
)
def test_what_is_refused(chain, error, words):
    with pytest.raises(error, match=words):
        closed_form(chain)
