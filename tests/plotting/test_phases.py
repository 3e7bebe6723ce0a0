"""Figures of phase diagrams show what the diagram holds."""

from __future__ import annotations

import pytest

from tests.refusal import refused
from tmsolve import Chain, ParameterError, bond, models, phase_diagram, spins
from tmsolve.plotting.files import save_figure
from tmsolve.plotting.phases import plot_phases

pytest.importorskip("matplotlib")


def polygons(ax):
    from matplotlib.patches import Polygon

    return [patch for patch in ax.patches if type(patch) is Polygon]


def legend(ax):
    return [text.get_text() for text in ax.get_legend().get_texts()]


def test_a_plane(tmp_path):
    diagram = phase_diagram(models.load("blume_emery_griffiths").chain.fix(J=1, K3=0, h=0), ("K", "D"))
    ax = plot_phases(diagram)
    shown = [{tuple(xy) for xy in patch.get_xy()} for patch in polygons(ax)]
    assert shown == [{(float(x), float(y)) for x, y in phase.corners} for phase in diagram.phases]
    looks = {(patch.get_facecolor(), patch.get_hatch()) for patch in polygons(ax)}
    assert len(looks) == len({hatch for _, hatch in looks}) == 3
    assert legend(ax)[0] == "1  (0, −1) | (1, 0) …,  $s$ = 0.3466"
    assert legend(ax)[3:] == ["boundary with entropy", "boundary without entropy"]
    assert [text.get_text() for text in ax.texts] == ["1", "2", "3"]
    widths = sorted(line.get_linewidth() for line in ax.lines if line.get_marker() == "None")
    assert widths == [0.8, 2.2, 2.2]
    assert (ax.get_xlim(), ax.get_ylim()) == tuple(tuple(map(float, ends)) for ends in diagram.box)
    assert (ax.get_xlabel(), ax.get_ylabel()) == ("$K$ [energy]", "$D$ [energy]")
    save_figure(ax, tmp_path / "plane.png")
    assert (tmp_path / "plane.png").stat().st_size > 5000


def test_a_line():
    diagram = phase_diagram(models.load("ising").chain.fix(J=-1), "h", {"h": (-3, 4)})
    ax = plot_phases(diagram)
    (curve,) = [line for line in ax.lines if len(line.get_xdata()) > 2]
    assert curve.get_xdata().tolist() == [-3, -2, 2, 4] and curve.get_ydata().tolist() == [-2, -1, -1, -3]
    assert legend(ax) == ["1  (−1)", "2  (1, −1)", "3  (1)", "boundary with entropy"]


def test_a_bent_line_is_drawn_through_many_points_and_into_given_axes():
    from matplotlib.figure import Figure

    chain = Chain(spins(1), [bond(lambda s, t, J: (J * J - 1) * s * s * t * t)])
    own = Figure().add_subplot()
    ax = plot_phases(phase_diagram(chain, "J", {"J": (0, 2)}), own)
    assert ax is own and max(len(line.get_xdata()) for line in ax.lines) > 100


def test_long_names_are_cut():
    chain = models.load("potts", q=6).chain
    ax = plot_phases(phase_diagram(chain.fix(h=0), "J"))
    assert all(len(text) < 60 for text in legend(ax)) and any("…" in text for text in legend(ax))


def test_anything_else_is_refused():
    refused(ParameterError, lambda: plot_phases(3), "what phase_diagram(…) returns", "3")
