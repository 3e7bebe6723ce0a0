"""Exact derivatives, of f and of its derivatives, against differences in 80 digits."""

import mpmath
import pytest

from tests.laws.reference import DIGITS, Reference
from tests.refusal import refused
from tmsolve import Chain, NotApplicable, ParameterError, StateSet, bond, ising, site, solve, spins, weight

EVERYTHING = Chain(
    {"a": ising(), "b": StateSet([-1, 0, 2], weights=[1, 3, 1])},
    [
        bond(lambda s, t, J: -J * s * t, ("a", "b"), shift=0),
        bond(lambda s, t, J, T: -J * J * s * t / (1 + T), ("b", "a")),
        site(lambda s, h: -h * s, "a"),
        site(lambda s, g, T: g**2 * s * s + T * s / 5, "b"),
        weight(lambda s, t, w, T: w**2 + T * w if s == t else w, ("a", 0), ("a", 1)),
    ],
    observables={"m": site(lambda s, scale: scale**2 * s, "a"), "e": bond(lambda s, t: s * t * t, ("a", "b"), shift=0)},
)
VALUES = {"T": "0.9", "J": "0.6", "h": "0.3", "g": "-0.7", "w": "1.3", "scale": "1.5"}


@pytest.fixture(scope="module")
def reference():
    return Reference(EVERYTHING, VALUES, ("m", "e"))


@pytest.fixture(scope="module")
def solution():
    return solve(EVERYTHING.at(**VALUES))


FREE = [
    ("J",),
    ("h",),
    ("g",),
    ("w",),
    ("T",),
    ("J", "J"),
    ("J", "T"),
    ("w", "T"),
    ("g", "h"),
    ("T", "T"),
    ("J", "g", "w"),
    ("J", "J", "T"),
    ("T", "T", "T"),
    ("h", "T", "w"),
    ("w", "w", "w"),
]


@pytest.mark.parametrize("names", FREE, ids="".join)
def test_of_the_free_energy(reference, solution, names):
    assert float(solution.derivative(*names)) == pytest.approx(float(reference.derivative(*names)), rel=1e-12)
    assert float(solution.derivative(*names[::-1])) == pytest.approx(float(solution.derivative(*names)), rel=1e-13)


#: Each quantity as f-derivatives: (factor as function of T, names); its derivatives follow by the product rule.
QUANTITIES = {
    "free_energy": [(lambda T: 1, ())],
    "entropy": [(lambda T: -1, ("T",))],
    "internal_energy": [(lambda T: 1, ()), (lambda T: -T, ("T",))],
    "specific_heat": [(lambda T: -T, ("T", "T"))],
    "mean(e)": [(lambda T: -1, ("field e",))],
    "susceptibility(e)": [(lambda T: -1, ("field e", "field e"))],
    "temperature_susceptibility(e)": [(lambda T: -T, ("field e", "field e"))],
    "susceptibility(e,m)": [(lambda T: -1, ("field e", "field m"))],
}


def expected(reference, quantity, names):
    T = mpmath.mpf(VALUES["T"])
    total = mpmath.mpf(0)
    with mpmath.workdps(DIGITS):
        for factor, inner in QUANTITIES[quantity]:
            total += factor(T) * reference.derivative(*inner, *names)
            slope = mpmath.diff(factor, T)
            if "T" in names and abs(slope) > 1e-20:
                rest = list(names)
                rest.remove("T")
                total += names.count("T") * slope * reference.derivative(*inner, *rest)
    return float(total)


OF = [
    ("entropy", ("J",)),
    ("entropy", ("T",)),
    ("entropy", ("J", "w")),
    ("internal_energy", ("h",)),
    ("internal_energy", ("T",)),
    ("internal_energy", ("T", "T")),
    ("specific_heat", ("T",)),
    ("specific_heat", ("w",)),
    ("specific_heat", ("g",)),
    ("mean(e)", ()),
    ("mean(e)", ("T",)),
    ("mean(e)", ("T", "J")),
    ("mean(e)", ("h", "g")),
    ("susceptibility(e)", ("h",)),
    ("susceptibility(e)", ("w",)),
    ("susceptibility(e,m)", ("T",)),
    ("temperature_susceptibility(e)", ("T",)),
    ("temperature_susceptibility(e)", ("J",)),
    ("free_energy", ("T", "T")),
]


@pytest.mark.parametrize(("quantity", "names"), OF, ids=str)
def test_of_other_quantities(reference, solution, quantity, names):
    wanted = expected(reference, quantity, names)
    assert float(solution.derivative(*names, of=quantity)) == pytest.approx(wanted, rel=1e-11)


@pytest.mark.parametrize("names", [("scale",), ("scale", "scale"), ("scale", "T"), ("scale", "J")], ids="".join)
def test_of_observables_that_depend_on_parameters(solution, names):
    """⟨m⟩ is scale² times a mean that does not depend on the scale."""
    scale, powers = 1.5, {0: 1.5**2, 1: 2 * 1.5, 2: 2.0}
    rest = tuple(name for name in names if name != "scale")
    base = float(solution.derivative(*rest, of="mean(m)")) / scale**2
    assert float(solution.derivative(*names, of="mean(m)")) == pytest.approx(
        powers[names.count("scale")] * base, rel=1e-13
    )


@pytest.mark.parametrize(("quantity", "member"), [(q, q.partition("(")[0]) for q in QUANTITIES])
def test_no_names_is_the_quantity_itself(solution, quantity, member):
    inside = quantity.partition("(")[2].rstrip(")")
    value = getattr(solution, member)
    assert solution.derivative(of=quantity) == (value(*inside.split(",")) if inside else value)


@pytest.mark.parametrize("order", [4, 5, 6])
def test_high_orders_of_a_free_spin(order):
    """A spin in a field: f = −T ln 2cosh(h/T); every derivative by h is known."""
    chain = Chain(ising(), [site(lambda s, h: -h * s), site(lambda s, g: -(g**3) * s)], observables={"m": lambda s: s})
    r = solve(chain.at(T="0.8", h="0.3", g="0.5"))
    with mpmath.workdps(60):
        T, h, g = mpmath.mpf("0.8"), mpmath.mpf("0.3"), mpmath.mpf("0.5")
        by_h = mpmath.diff(lambda x: -T * mpmath.log(2 * mpmath.cosh((x + g**3) / T)), h, order)
        by_g = mpmath.diff(lambda x: -T * mpmath.log(2 * mpmath.cosh((h + x**3) / T)), g, order)
        by_t = mpmath.diff(lambda x: -x * mpmath.log(2 * mpmath.cosh((h + g**3) / x)), T, order)
    assert float(r.derivative(*["h"] * order)) == pytest.approx(float(by_h), rel=1e-11)
    assert float(r.derivative(*["g"] * order)) == pytest.approx(float(by_g), rel=1e-11)
    assert float(r.derivative(*["T"] * order)) == pytest.approx(float(by_t), rel=1e-11)


SPIN = Chain(
    spins(1),
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)],
    observables={"m": lambda s: s, "q": lambda s: s * s},
)
POINT = SPIN.at(T=1, J=1, D="0.5", h=0)


@pytest.mark.parametrize(
    ("act", "error", "fragments"),
    [
        (lambda r: r.derivative("d"), ParameterError, ("no parameter 'd'", "J, D, h", "Did you mean 'D'?")),
        (lambda r: r.derivative("J", "t"), ParameterError, ("no parameter 't'", "Did you mean 'T'?")),
        (lambda r: r.derivative(*"JJJJJJJ"), NotApplicable, ("go to order 6, got 7",)),
        (lambda r: r.derivative("J", of="energy"), ParameterError, ("no quantity 'energy'", "free_energy")),
        (lambda r: r.derivative("J", of="entrpy"), ParameterError, ("Did you mean 'entropy'?",)),
        (lambda r: r.derivative("J", of="gap"), NotApplicable, ("gap is not a derivative of the free energy", "mean")),
        (lambda r: r.derivative("J", of="correlation_length(m)"), NotApplicable, ("correlation_length(m) is not",)),
        (lambda r: r.derivative("J", of="mean(M)"), ParameterError, ("no observable 'M'", "Did you mean 'm'?")),
        (
            lambda r: r.derivative("J", of="mean"),
            ParameterError,
            ("mean takes 1 observable in brackets", "got 0", "m, q"),
        ),
        (
            lambda r: r.derivative("J", of="susceptibility(m,q,m)"),
            ParameterError,
            ("takes 1 to 2 observables", "got 3"),
        ),
        (lambda r: r.derivative("J", of="mean(m"), ParameterError, ("name or name(observable), got 'mean(m'",)),
        (lambda r: r.derivative("J", of=None), ParameterError, ("name or name(observable), got None",)),
        (lambda r: r.mean("x"), ParameterError, ("no observable 'x'", "m, q")),
        (lambda r: r.susceptibility("m", "Q"), ParameterError, ("no observable 'Q'", "Did you mean 'q'?")),
    ],
)
def test_refused(act, error, fragments):
    refused(error, lambda: act(solve(POINT)), *fragments)
