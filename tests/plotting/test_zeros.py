"""Figures of zeros and limiting curves: what is drawn, and what is refused."""

import numpy as np
import pytest

pytest.importorskip("matplotlib")

from tests.refusal import refused
from tmsolve import Chain, ParameterError, bond, ising, site, spins
from tmsolve.plotting.zeros import plot_zeros
from tmsolve.symbolic.counting.limiting import limiting_curve
from tmsolve.symbolic.counting.zeros import zeros

ISING = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
BLUME_CAPEL = Chain(spins(1), [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h: D * s * s - h * s)])


@pytest.fixture(scope="module")
def found():
    chain = BLUME_CAPEL.fix(J=1, T="0.7", D="1.4")
    return zeros(chain, 5), limiting_curve(chain, points=30)


def line(ax, label):
    """Return the line with a label."""
    return next(one for one in ax.lines if one.get_label() == label)


def test_zeros_curve_circle_and_edges(found):
    points, curve = found
    ax = plot_zeros(points, curve)
    drawn = line(ax, "zeros, $N = 5$")
    assert np.array_equal(drawn.get_xdata() + 1j * drawn.get_ydata(), points.array)
    circle = line(ax, "$|z| = 1$")
    assert np.allclose(np.hypot(circle.get_xdata(), circle.get_ydata()), 1)
    edges = line(ax, "edges")
    assert np.allclose(edges.get_xdata() + 1j * edges.get_ydata(), [complex(z) for z in curve.edges])
    assert ax.get_xlabel() == "Re $z$" and ax.get_ylabel() == "Im $z$"
    assert ax.get_title() == r"$z = e^{-\beta h}$"
    assert ax.get_aspect() == 1 and ax.get_xlim()[1] - ax.get_xlim()[0] == pytest.approx(np.ptp(ax.get_ylim()))
    texts = [text.get_text() for text in ax.get_legend().get_texts()]
    assert texts == ["$|z| = 1$", r"$|\lambda_1| = |\lambda_2|$", "edges", "zeros, $N = 5$"]


def test_multiplicities_are_written_and_the_circle_can_be_left_out():
    ax = plot_zeros(zeros(Chain(ising(), [site(lambda s, mu0: -mu0 * s)]), 4, variable="mu0"), circle=False)
    assert [text.get_text() for text in ax.texts] == ["4"]
    assert ax.get_title() == r"$z = e^{-2\beta \mathrm{mu0}}$"
    assert "$|z| = 1$" not in [one.get_label() for one in ax.lines]


def test_a_curve_in_a_root_of_the_variable_is_raised_to_its_power():
    chain = Chain(ising(), [bond(lambda s, t, J: -J * s * t), bond(lambda s, t, J: -2 * J * s * t, shift=2)])
    points, curve = zeros(chain, 8, variable="J"), limiting_curve(chain, variable="J", points=20)
    power = points.fugacity.step / curve.fugacity.step
    assert power.denominator == 1
    plot_zeros(points, curve)


def test_the_temperature_as_variable_and_the_file(tmp_path):
    ax = plot_zeros(zeros(ISING.fix(J="0.3", h=0), 6, variable="T"))
    assert ax.get_title() == r"$z = e^{-\frac{6}{5}\beta}$"
    ax.figure.savefig(tmp_path / "zeros.png")
    assert (tmp_path / "zeros.png").stat().st_size > 5000


def test_far_zeros_are_counted_not_drawn():
    far = zeros(ISING.fix(J=1, h=0), 16, variable="T")
    ax = plot_zeros(far)
    hidden = int((np.abs(far.array) > ax.get_xlim()[1] - ax.get_xlim()[0]).sum())
    assert hidden == 1 and ax.texts[0].get_text() == "1 further out, up to $|z| = 103$"


def test_messages(found):
    points, _ = found
    refused(ParameterError, lambda: plot_zeros([1j]), "result of zeros(…)", "[1j]")
    refused(ParameterError, lambda: plot_zeros(points, points), "result of limiting_curve(…)")
    other = limiting_curve(ISING.fix(J=1, T=1), points=4)
    refused(ParameterError, lambda: plot_zeros(points, other), "exp(-beta*h)", "exp(-2*beta*h)", "same chain")
    refused(ParameterError, lambda: plot_zeros(points, ax=3), "matplotlib axes")
