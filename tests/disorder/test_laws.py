"""Laws of random parameters: every form a user may give, what they draw, what is refused."""

from fractions import Fraction

import numpy as np
import pytest
from scipy import stats

from tests.refusal import refused
from tmsolve.disorder.laws import Mixture, Normal, Realisation, Uniform, as_law
from tmsolve.errors import DeclarationError, ParameterError

FORMS = {
    "mixture": {-1: "0.25", 2: "0.75"},
    "normal": stats.norm(0.5, 2),
    "uniform": stats.uniform(-1, 3),
    "gamma": stats.gamma(3.0),
    "bernoulli": stats.bernoulli(0.3),
    "listed": stats.rv_discrete(values=([-2, 5], [0.4, 0.6])),
    "text": "choice(-1:1/3,1:2/3)",
    "sampler": lambda rng, size: rng.exponential(2.0, size),
}


@pytest.mark.parametrize("form", FORMS)
def test_draws_have_the_mean_of_the_law_and_repeat_with_the_seed(form):
    law = as_law(FORMS[form])
    drawn = law.draw(np.random.default_rng(3), (200, 100))
    assert drawn.shape == (200, 100) and drawn.dtype == np.float64
    assert abs(drawn.mean() - law.mean) < 5 * drawn.std() / np.sqrt(drawn.size) + 0.03 * (form == "sampler")
    assert np.array_equal(drawn, law.draw(np.random.default_rng(3), (200, 100)))


@pytest.mark.parametrize("form", [form for form in FORMS if form != "sampler"])
def test_quadrature_integrates_powers(form):
    law = as_law(FORMS[form])
    nodes, weights = law.quadrature(400)
    drawn = law.draw(np.random.default_rng(5), 400_000)
    for power in (1, 2, 3):
        assert np.isclose(weights @ nodes**power, (drawn**power).mean(), rtol=0.05)


def test_known_distributions_keep_their_kind():
    assert as_law(stats.norm(1, 0.5)) == Normal(1.0, 0.5) == as_law("normal(1, 0.5)")
    assert as_law(stats.uniform(-1, 2)) == Uniform(-1.0, 1.0) == as_law("uniform(-1,1)")
    assert as_law(stats.bernoulli(0.25)) == as_law({0: "0.75", 1: "0.25"})
    assert isinstance(as_law([1, 2, 3]), Realisation) and as_law(np.array([1.0, 3.0])).mean == 2


def test_probabilities_stay_exact_and_repeated_values_join():
    law = as_law({"1/3": "1/7", 0.1: "6/7"})
    assert law == Mixture(((Fraction(1, 3), Fraction(1, 7)), (Fraction(1, 10), Fraction(6, 7))))
    thirds = as_law({-1: 1 / 3, 0: 1 / 3, 1: 1 / 3})
    assert sum(chance for _, chance in thirds.support) == 1


@pytest.mark.parametrize(
    ("value", "error", "fragments"),
    [
        (stats.cauchy(0, 1), DeclarationError, ["cauchy", "mean", "finite mean"]),
        (stats.pareto(0.8), DeclarationError, ["pareto", "inf"]),
        ({-1: 0.5, 1: 0.4}, DeclarationError, ["sum to 0.9", "not to one"]),
        ({-1: 1.5, 1: -0.5}, DeclarationError, ["-0.5", "from 0 to 1"]),
        ({-1: "half", 1: 0.5}, DeclarationError, ["'half'", "from 0 to 1"]),
        ({"up": 1}, ParameterError, ["'up'"]),
        ({}, DeclarationError, ["at least one value"]),
        ([[1, 2], [3, 4]], DeclarationError, ["one row"]),
        ([1, float("nan")], ParameterError, ["NaN"]),
        (3, DeclarationError, ["got 3", "scipy.stats"]),
        ("gaussian(0,1)", DeclarationError, ["gaussian", "normal(MEAN,DEVIATION)"]),
        ("norml(0,1)", DeclarationError, ["Did you mean 'normal'?"]),
        ("normal(0,-1)", DeclarationError, ["must be > 0"]),
        ("normal(0)", DeclarationError, ["two numbers"]),
        ("uniform(1,1)", DeclarationError, ["LOW < HIGH"]),
        ("choice(1,2)", DeclarationError, ["pairs every value"]),
        ("choice(1:0.5,1:0.5)", DeclarationError, ["twice"]),
        ("choice(1:0.5,2:x)", DeclarationError, ["'x'", "not a number"]),
    ],
)
def test_what_is_no_law_is_refused(value, error, fragments):
    refused(error, lambda: as_law(value), *fragments)


def test_samplers_are_checked_when_they_draw():
    rng = np.random.default_rng(0)
    refused(DeclarationError, lambda: as_law(lambda r, n: 1.0).draw(rng, 4), "f(rng, size)", "(4,)")
    refused(DeclarationError, lambda: as_law(lambda r, n: np.full(n, np.inf)).draw(rng, 4), "not finite")
    refused(DeclarationError, lambda: as_law(lambda r, n: r.random(n)).quadrature(5), "drawn from but not integrated")
    refused(DeclarationError, lambda: as_law([1, 2]).draw(rng, 2), "one realisation")
