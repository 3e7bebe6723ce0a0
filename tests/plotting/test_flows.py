"""Flow figures: trajectories, axes, what is refused."""

import numpy as np
import pytest

from tests.symbolic.refusing import refuses
from tmsolve import Chain, bond, ising, site, spins
from tmsolve.errors import ParameterError
from tmsolve.plotting.flows import plot_flow
from tmsolve.symbolic.decimation.flow import flow

FIELD = Chain(ising(), [bond(lambda s, t, J: -J * s * t), site(lambda s, h: -h * s)])
CAPEL = Chain(spins(1), [bond(lambda s, t, J: -J * s * t), site(lambda s, D: D * s * s)])


@pytest.fixture(scope="module")
def way():
    return flow(FIELD.at(T=2, J=[2, 4, 6], h=["0.1", 0, "-0.4"]), steps=5)


def test_one_trajectory_per_point_on_compact_axes(way):
    ax = plot_flow(way)
    lines = [line for line in ax.lines if len(line.get_xdata()) == 6]
    assert len(lines) == 3 and ax.get_xlabel() == "$J/T$" and ax.get_ylabel() == "$h/T$"
    K = way.parameters["J"][:, 0] / 2
    assert np.allclose(lines[0].get_xdata(), K / (1 + K))
    assert ax.get_xlim() == (0, 1) and ax.get_ylim() == (-1, 1)
    assert [tick.get_text() for tick in ax.get_xticklabels()] == ["0", "0.3", "1", "3", "∞"]
    assert [tick.get_text() for tick in ax.get_yticklabels()][:2] == ["−∞", "−3"]


def test_plain_axes_and_one_coupling(way):
    ax = plot_flow(way, "J", compact=False)
    assert ax.get_xlabel() == "step" and ax.get_ylabel() == "$J/T$"
    assert np.allclose(ax.lines[0].get_ydata(), way.reduced("J")[:, 0])


def test_missing_couplings_can_be_drawn():
    ax = plot_flow(flow(CAPEL.at(T="0.5", J=1, D="0.8"), steps=3), "J", "s**2*s'**2")
    assert ax.get_ylabel() == r"coupling of $s^2\,s'^2$ over $T$"
    ax.figure.canvas.draw()


def test_several_flows_and_given_axes(way):
    first = plot_flow(way)
    again = plot_flow([way, flow(FIELD.at(T=1, J=1, h=1))], ax=first)
    assert again is first and len(first.lines) == 2 * 3 + 2 * 4


def test_refused(way):
    with refuses(ParameterError, "takes a flow", "flow(point)"):
        plot_flow(FIELD)
    with refuses(ParameterError, "takes a flow"):
        plot_flow([])
    with refuses(ParameterError, "no coupling 'K'", "J, h"):
        plot_flow(way, "K")
    with refuses(ParameterError, "no coupling of this flow moves", "x="):
        plot_flow(flow(FIELD.at(T=1, J=0, h=0)))
