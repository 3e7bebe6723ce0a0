"""Parts of the search on their own: roots, pieces, samples, ranges, discriminants, rounding."""

import math

import numpy as np
import pytest

from tests.survey.chains import BLUME_CAPEL, ISING, ZIGZAG
from tmsolve import Chain, bond, colours, ising, occupation, site, solve, spins
from tmsolve.survey.levels import extremes
from tmsolve.survey.line import make_line
from tmsolve.survey.merging import discriminant, leading, spectra
from tmsolve.survey.pieces import Pieces
from tmsolve.survey.roots import polish, settle
from tmsolve.survey.rounding import largest_energy, parameter_rounding
from tmsolve.survey.sampling import sample

ONE = np.ones(1)


def located(function, low, high):
    """Return the settled root of one function on one bracket."""
    low, high = np.array([low]), np.array([high])
    falling = function(low)[0] > 0
    x = polish(function, low, high, falling, np.abs(high))
    return settle(function, x, np.abs(high), np.abs(function(high)[0]))[0]


@pytest.mark.parametrize(
    ("function", "low", "high", "exact"),
    [
        (lambda x: (np.cos(x) - x, -np.sin(x) - 1), 0.0, 1.0, "0.7390851332151606"),
        (lambda x: (x**9 - 1e-9, 9 * x**8), 0.0, 1.0, "0.1"),
        (lambda x: (np.arctan(1e8 * (x - 1 / 3)), 1e8 / (1 + 1e16 * (x - 1 / 3) ** 2)), 0.0, 1.0, repr(1 / 3)),
        (lambda x: (np.exp(-1 / x) - np.exp(-3), np.exp(-1 / x) / x**2), 0.01, 10.0, repr(1 / 3)),
        (lambda x: (2 - x, -np.ones_like(x)), 0.0, 100.0, "2"),
    ],
    ids=["Dottie", "flat", "steep", "exponential", "straight"],
)
def test_roots_are_found_to_the_last_digits(function, low, high, exact):
    root = located(function, low, high)
    assert abs(root.location - float(exact)) <= root.error < 1e-13


def test_rounding_widens_the_error():
    wobble = np.random.default_rng(5)

    def rough(x):
        return x - 1 + 1e-9 * wobble.uniform(-1, 1, x.shape), np.ones_like(x)

    root = located(rough, 0.0, 3.0)
    assert 1e-10 < root.error < 1e-8 and abs(root.location - 1) <= root.error


def test_nothing_but_rounding_is_no_root():
    wobble = np.random.default_rng(6)

    def noise(x):
        return 1e-16 * wobble.uniform(-1, 1, x.shape), 1e-16 * wobble.uniform(-1, 1, x.shape)

    assert settle(noise, ONE, ONE, ONE)[0] is None


def test_a_step_is_located_between_neighbouring_doubles():
    root = located(lambda x: (np.where(x > math.pi, 1.0, -1.0), np.zeros_like(x)), 0.0, 10.0)
    assert root.steep and root.location <= math.pi <= root.location + root.error and root.error < 1e-15


def test_no_roots_is_no_trouble():
    assert settle(lambda x: (x, x), np.empty(0), np.empty(0), np.empty(0)) == []


def pieces(function, slope, low, high, noise=0.0):
    x = np.array([low, (low + high) / 2, high])[:, None, None]
    level = np.full((1, 1), noise)
    return Pieces(function(x), slope(x), np.array([high - low]), level, level)


def test_a_cubic_is_known_from_its_ends():
    piece = pieces(lambda x: x**3 - x + 3, lambda x: 3 * x**2 - 1, -1.0, 2.0)
    assert piece.error[0, 0] < 1e-14 and piece.smooth[0, 0] and piece.clear[0, 0]


def test_an_exponential_is_known_from_its_logarithm():
    piece = pieces(lambda x: np.exp(-30 * x), lambda x: -30 * np.exp(-30 * x), 0.0, 1.0)
    assert piece.error[0, 0] > 1 and piece.clear[0, 0]


def test_two_roots_in_one_interval_are_not_clear():
    assert not pieces(lambda x: (x - 0.3) * (x - 0.6), lambda x: 2 * x - 0.9, 0.0, 1.0).clear[0, 0]


def test_a_step_between_the_points_is_not_smooth():
    piece = pieces(lambda x: np.where(x > 0.7, 1.0, 0.0), np.zeros_like, 0.0, 1.0)
    assert not piece.smooth[0, 0]


def test_failed_points_are_told_from_lost_intervals():
    piece = pieces(lambda x: np.where(x > 0.7, np.nan, x), np.ones_like, 0.0, 1.0)
    assert piece.incomplete[0] and not piece.empty[0]


def test_smooth_curves_need_few_points():
    from tmsolve.survey.curves import guards, maximum_curve

    line = make_line(ISING.fix(J=1), "T", (0.05, 10))
    found = sample(line, [maximum_curve(line, "specific_heat")], guards(line, {"m": 1.0}), 33)
    assert found.x.size < 100 and found.x[0] == 0.05 and found.x[-1] == 10 and (np.diff(found.x) > 0).all()
    assert len(found.brackets(0, falling=True)) == 1


@pytest.mark.parametrize(
    ("chain", "name", "expected"),
    [
        (BLUME_CAPEL.at(T=1, J=1, D=0), "m", (-1, 1)),
        (BLUME_CAPEL.at(T=1, J=1, D=0), "q", (0, 1)),
        (Chain(occupation(), [bond(lambda s, t: math.inf if s * t else 0)], {"n": lambda s: s}).at(T=1), "n", (0, 0.5)),
        (
            Chain(
                occupation(),
                [bond(lambda s, t: math.inf if s * t else 0), bond(lambda s, t: math.inf if s * t else 0, shift=2)],
                {"n": lambda s: s},
            ).at(T=1),
            "n",
            (0, 1 / 3),
        ),
        (Chain(ising(), [bond(lambda s, t: 0)], {"k": bond(lambda s, t: s * t, shift=2)}).at(T=1), "k", (-1, 1)),
        (
            Chain(
                {"n": ising(), "d": spins(1)},
                [bond(lambda s, t: -s * t, ("n", "d"), shift=0), bond(lambda s, t: -s * t, ("d", "n"))],
                {"both": lambda s: s, "mixed": bond(lambda s, t: s * t, ("n", "d"), shift=0)},
            ).at(T=1),
            "both",
            (-2, 2),
        ),
        (Chain(colours(3), [site(lambda s: 0)], {"c": lambda s, g: g * s}).at(T=1, g=-2), "c", (-4, 0)),
    ],
    ids=["spin", "square", "hard core", "hard core of two", "two apart", "decorated", "parameter"],
)
def test_ranges_of_observables(chain, name, expected):
    assert extremes(chain, name) == pytest.approx(expected, abs=1e-14)


def test_frustration_limits_a_sum_of_bonds():
    """Three bonds of a triangle cannot all be unequal: per triangle of two spins at least −1 of 3."""
    chain = Chain(
        ising(),
        [bond(lambda s, t, J: J * s * t)],
        {"e": [bond(lambda s, t: s * t), bond(lambda s, t: s * t, shift=2)]},
    )
    least, most = extremes(chain.at(T=1, J=1), "e")
    assert most == 2 and least == pytest.approx(-1, abs=1e-14)


def test_the_discriminant_is_analytic_where_the_eigenvalues_are_not():
    """Through D03 the eigenvalues move as a square root, their splitting as a straight line."""
    T = 0.82050896496424416101 + 1e-9 * np.arange(-4, 5)
    values = spectra(solve(ZIGZAG.at(J1=1, J2="-0.25", T=T)))
    mean, split = discriminant(values, 0.364, 2)
    slope = np.polyfit(T - T[4], split, 1)[0]
    assert abs(split[4]) < 1e-15 and np.ptp(np.diff(split)) < 2e-15
    assert split == pytest.approx(slope * (T - T[4]), abs=2e-15)
    assert np.ptp(mean) < 1e-8


def test_the_leading_mode_depends_on_the_observable():
    """Without field an even observable does not show the odd mode. Blume-Capel chain at h = 0."""
    solution = solve(BLUME_CAPEL.at(J=1, D="0.5", T=[0.5, 1.0]))
    everything, odd, even = leading(solution, [None, "m", "q"])
    assert everything.value == pytest.approx(odd.value)
    assert (np.abs(even.value) < np.abs(odd.value)).all()
    assert -1 / np.log(np.abs(even.value)) == pytest.approx(solution.correlation_length("q"), rel=1e-9)


def test_energies_set_the_size_of_rounding():
    chain = BLUME_CAPEL.fix(J=-2, D=3, h=0)
    assert largest_energy(chain.at(T=1)) == 5
    rounding = parameter_rounding(make_line(chain, "T", (0.1, 1)), 0.5)
    assert rounding == {
        name: pytest.approx(2.0**-53 * (abs(size) + 5)) for name, size in {"J": 2, "D": 3, "h": 0}.items()
    }


def test_lines_divide_evenly_or_by_ratios():
    wide, narrow = (make_line(ISING.fix(J=1), "T", ends) for ends in ((0.1, 10), (1, 2)))
    assert wide.geometric and not narrow.geometric
    assert wide.spread(3) == pytest.approx([0.1, 1, 10]) and narrow.spread(3).tolist() == [1, 1.5, 2]
    assert wide.spread(5)[[0, -1]].tolist() == [0.1, 10]
