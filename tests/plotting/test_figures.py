"""Figures: what is drawn, how it is labelled, and what is refused."""

import subprocess
import sys

import numpy as np
import pytest

pytest.importorskip("matplotlib")

import matplotlib as mpl
from matplotlib.colors import LogNorm, to_hex
from matplotlib.figure import Figure

from tests.house_graph import ROOT
from tests.refusal import refused
from tmsolve import Chain, MissingExtra, ParameterError, axis, bond, crossovers, ising, scan, site, spins, weight
from tmsolve.plotting import plot_events, plot_gaps, plot_lines, plot_map, save_figure
from tmsolve.plotting.maps import _branches, _edges
from tmsolve.plotting.style import COLOURS
from tmsolve.survey.event import Event
from tmsolve.survey.outputs import OutputError

CHAIN = Chain(
    spins(1),
    # The weight changes nothing but that there is no T = 0.
    [bond(lambda s, t, J: -J * s * t), site(lambda s, D, h=0: D * s * s - h * s), weight(lambda s: 1)],
    observables={"m": lambda s: s, "q": lambda s: s * s},
    name="Blume-Capel",
).fix(J=1)
ZIGZAG = Chain(
    ising(),
    [bond(lambda s, t, J1: -J1 * s * t), bond(lambda s, t, J2: -J2 * s * t, shift=2)],
    observables={"m": lambda s: s},
).fix(J1=1, J2="-0.25")


@pytest.fixture(scope="module")
def grid():
    return scan(
        CHAIN, {"T": axis("T", "0.1", 2, 20), "D": [0.5, 1.0, 1.5]}, ["specific_heat", "mean(q)", "susceptibility(m)"]
    )


# --- lines


def test_one_line_per_value_with_colour_and_stroke(grid):
    ax = plot_lines(grid, "specific_heat", along="T")
    assert len(ax.lines) == 3
    assert len({line.get_color() for line in ax.lines}) == 3 == len({str(line._dash_pattern) for line in ax.lines})
    assert [line.get_color() for line in ax.lines] == list(COLOURS[:3])
    for line, values in zip(ax.lines, grid["specific_heat"].T, strict=True):
        assert np.array_equal(line.get_xdata(), grid["T"]) and np.array_equal(line.get_ydata(), values)


def test_labels_have_symbols_and_units(grid):
    ax = plot_lines(grid, "specific_heat", along="T")
    assert ax.get_xlabel() == "$T$ [energy]" and ax.get_ylabel() == r"$c$ [$k_\mathrm{B}$]"
    legend = ax.get_legend()
    assert legend.get_title().get_text() == "$D$"
    assert [text.get_text() for text in legend.get_texts()] == ["0.5", "1", "1.5"]
    ax = plot_lines(grid, "susceptibility(m)", along="D", at={"T": 0.5})
    assert ax.get_xlabel() == "$D$" and ax.get_ylabel() == r"$\chi_{m}$ [1/energy]" and len(ax.lines) == 1
    assert plot_lines(grid, "mean( q )", along="T").get_ylabel() == r"$\langle q \rangle$"


def test_many_lines_get_shades_and_a_colour_bar():
    grid = scan(CHAIN, {"T": [0.5, 1, 2], "D": axis("D", 0, 2, 12)}, ["entropy"])
    ax = plot_lines(grid, along="T")
    assert len(ax.lines) == 12 and ax.get_legend() is None
    assert len(ax.figure.axes) == 2 and ax.figure.axes[1].get_ylabel() == "$D$"
    assert len({to_hex(line.get_color()) for line in ax.lines}) == 12


def test_failed_points_are_gaps_and_lonely_points_are_dots():
    def patchy(solution):
        T = np.asarray(solution.point.T)
        if np.isin(T, [2.0, 4.0]).any():
            raise ValueError("not here")
        return solution.entropy

    grid = scan(CHAIN.fix(D=1), {"T": axis("T", 1, 6, 6)}, [patchy])
    ax = plot_lines(grid)
    line, dots = ax.lines
    assert np.isnan(line.get_ydata()).tolist() == [False, True, False, True, False, False]
    assert dots.get_xdata().tolist() == [1.0, 3.0] and dots.get_marker() == "."
    assert ax.get_ylabel() == r"$\mathrm{patchy}$"


def test_geometric_axes_are_drawn_so():
    grid = scan(CHAIN.fix(D=1), {"T": axis("T", "0.1", 10, 9, "log")}, ["entropy"])
    assert plot_lines(grid).get_xscale() == "log"
    assert plot_lines(scan(CHAIN.fix(D=1), {"T": [1, 2, 3]}, ["entropy"])).get_xscale() == "linear"


def test_tick_labels_of_a_short_logarithmic_axis_are_plain_numbers():
    ax = plot_lines(scan(CHAIN.fix(D=1), {"T": axis("T", "0.2", 3, 9, "log")}, ["entropy"]))
    ax.figure.canvas.draw()
    shown = [label.get_text() for label in ax.get_xticklabels()]
    assert {"0.5", "1", "2"} <= set(shown) and not any(label.get_text() for label in ax.get_xticklabels(minor=True))


def test_events_are_marked_on_the_curve():
    grid = scan(CHAIN.fix(D="0.9"), {"T": axis("T", "0.05", 2, 40)}, ["specific_heat"])
    events = crossovers(CHAIN.fix(D="0.9"), "T", (0.05, 2), watch=["specific_heat", "susceptibility(q)"])
    ax = plot_lines(grid, events=events)
    peak = next(e for e in events if "specific_heat" in e.kind)
    marks = [line for line in ax.lines if line.get_marker() == "o"]
    assert [(m.get_xdata()[0], m.get_ydata()[0]) for m in marks] == [(peak.location, peak.height)]
    assert {t.get_text() for t in ax.get_legend().get_texts()} == {"maximum of $c$", r"maximum of $\chi_{q}$"}


def test_events_on_several_lines_take_the_line_s_colour(grid):
    events = {D: crossovers(CHAIN.fix(D=D), "T", (0.1, 2), watch="specific_heat") for D in (0.5, 1.5)}
    ax = plot_lines(grid, "specific_heat", along="T", events=events)
    marks = [line for line in ax.lines if line.get_marker() == "o"]
    assert [mark.get_color() for mark in marks] == [COLOURS[0], COLOURS[2]]
    assert len(ax.get_legend().get_texts()) == 3


# --- maps


def test_a_map_has_a_labelled_colour_bar(grid):
    ax = plot_map(grid, "specific_heat", x="D", y="T")
    assert (ax.get_xlabel(), ax.get_ylabel()) == ("$D$", "$T$ [energy]")
    mesh = ax.collections[0]
    assert np.array_equal(np.asarray(mesh.get_array()), grid["specific_heat"])
    assert mesh.get_cmap().name == "cividis"
    assert ax.figure.axes[1].get_ylabel() == r"$c$ [$k_\mathrm{B}$]"
    swapped = plot_map(grid, "specific_heat", x="T", y="D")
    assert np.array_equal(np.asarray(swapped.collections[0].get_array()), grid["specific_heat"].T)


def test_failed_cells_are_hatched(tmp_path):
    grid = scan(CHAIN, {"T": [0, 1, 2], "D": [0, 1, 2]}, ["entropy"])
    ax = plot_map(grid, x="D", y="T")
    assert np.ma.getmaskarray(ax.collections[0].get_array())[0].all() and ax.patch.get_hatch() == "////"
    whole = plot_map(scan(CHAIN, {"T": [1, 2], "D": [0, 1]}, ["entropy"]))
    assert whole.patch.get_hatch() is None


def test_logarithmic_colours():
    grid = scan(CHAIN, {"T": [0.3, 1, 2], "D": [0, 1]}, ["correlation_length", "free_energy"])
    assert isinstance(plot_map(grid, "correlation_length", log=True).collections[0].norm, LogNorm)
    refused(ParameterError, lambda: plot_map(grid, "free_energy", log=True), "log=True", "positive", "free_energy")


def test_lines_of_crossovers_on_a_map():
    chain = CHAIN.fix(h=0)
    grid = scan(chain, {"T": axis("T", "0.2", 1, 9), "D": axis("D", 0, 2, 11)}, ["mean(q)"])
    events = {T: crossovers(chain.fix(T=T), "D", (0, 2), watch="mean(q)") for T in (0.2, 0.6, 1.0)}
    ax = plot_map(grid, x="D", y="T", events=events)
    (line,) = ax.lines
    assert line.get_ydata().tolist() == [0.2, 0.6, 1.0]
    assert line.get_xdata() == pytest.approx(np.array([0.2, 0.6, 1]) * np.log(2 * np.cosh(1 / np.array([0.2, 0.6, 1]))))
    assert [t.get_text() for t in ax.get_legend().get_texts()] == [r"half-way of $\langle q \rangle$"]
    turned = plot_map(grid, x="T", y="D", events=events)
    assert turned.lines[0].get_xdata().tolist() == [0.2, 0.6, 1.0]


def test_branches_follow_the_nearest_event():
    def event(x):
        return Event("maximum of c", "D", x, 0.0, 1.0, 1.0)

    rows = [(1.0, [event(0.0), event(1.0)]), (2.0, [event(1.05)]), (3.0, [event(0.2), event(1.1)])]
    branches = _branches(rows, 0.25)
    shapes = sorted([(v, e.location) for v, e in branch] for branch in branches)
    assert shapes == [[(1.0, 0.0)], [(1.0, 1.0), (2.0, 1.05), (3.0, 1.1)], [(3.0, 0.2)]]


def test_cells_end_half_way_between_points():
    assert _edges(np.array([1.0, 2.0, 5.0])).tolist() == [0.5, 1.5, 3.5, 6.5]
    assert _edges(np.array([1.0, 10.0, 100.0])) == pytest.approx(10.0 ** np.array([-0.5, 0.5, 1.5, 2.5]))
    assert _edges(np.array([3.0])).tolist() == [2.5, 3.5]


# --- gaps


def test_gap_spectra_show_where_modes_merge():
    """Below D03 the two leading gaps of the zigzag chain differ, above they are one. Stephenson (1970)."""
    (point,) = crossovers(ZIGZAG, "T", (0.2, 3), watch="disorder")
    ax = plot_gaps(ZIGZAG, "T", (0.2, 3), k=3, events=[point])
    first, second, _, mark = ax.lines
    T = first.get_xdata()
    apart = np.abs(first.get_ydata() - second.get_ydata())
    assert point.location in T and (apart[T < point.location - 1e-3] > 1e-2).all()
    assert (apart[T > point.location + 1e-3] < 1e-9).all()
    assert mark.get_xdata()[0] == point.location
    assert ax.get_xlabel() == "$T$ [energy]" and "[1/cell]" in ax.get_ylabel()
    assert len({str(line._dash_pattern) for line in ax.lines[:3]}) == 3


def test_the_lowest_gap_is_the_inverse_correlation_length():
    ax = plot_gaps(CHAIN.fix(D=1), "T", (0.2, 2), k=1, points=5)
    grid = scan(CHAIN.fix(D=1), {"T": ax.lines[0].get_xdata()}, ["correlation_length"])
    assert ax.lines[0].get_ydata() == pytest.approx(1 / grid["correlation_length"])


def test_gaps_along_a_parameter_with_a_failing_point():
    frozen = Chain(ising(), [bond(lambda s, t: 0 if s == t else float("inf")), site(lambda s, h: -h * s)])
    ax = plot_gaps(frozen.fix(T=1), "h", (-1, 1), k=1, points=3)
    assert np.isnan(ax.lines[0].get_ydata()).tolist() == [False, True, False] and ax.get_xlabel() == "$h$"


# --- events


def test_events_on_given_axes():
    ax = Figure().add_subplot()
    events = [Event("disorder point", "T", 0.8, 0, 1, 1), Event("half-way of q", "T", 1.2, 0, 0.5, 1)]
    assert plot_events(ax, events, "mean(q)") is ax
    line, mark = ax.lines
    assert line.get_xdata()[0] == 0.8 and (mark.get_xdata()[0], mark.get_ydata()[0]) == (1.2, 0.5)
    assert line.get_linestyle() != "-" or line._dash_pattern[1] is not None


# --- axes, settings, files


def test_figures_are_drawn_into_given_axes(grid):
    figure = Figure()
    for k, draw in enumerate((plot_lines, plot_map)):
        ax = figure.add_subplot(1, 2, k + 1)
        assert draw(grid, "mean(q)", ax=ax) is ax


def test_the_user_s_settings_are_left_alone(grid, tmp_path):
    before = dict(mpl.rcParams)
    with mpl.rc_context({"font.size": 23.0}):
        save_figure(plot_lines(grid, "mean(q)", along="T"), tmp_path / "a.svg")
        assert mpl.rcParams["font.size"] == 23.0
    assert dict(mpl.rcParams) == before


def test_nothing_is_shown_and_pyplot_is_not_even_loaded():
    program = (
        "import sys\n"
        "from tmsolve import Chain, bond, ising, scan\n"
        "import tmsolve.plotting as p\n"
        "assert 'matplotlib' not in sys.modules\n"
        "grid = scan(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]), {'T': [1, 2], 'J': [1, 2]}, ['entropy'])\n"
        "p.plot_lines(grid), p.plot_map(grid)\n"
        "assert 'matplotlib.pyplot' not in sys.modules\n"
    )
    subprocess.run([sys.executable, "-c", program], check=True, cwd=ROOT)


@pytest.mark.parametrize(("suffix", "start"), [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF")])
def test_three_formats_are_written_the_same_every_time(grid, tmp_path, suffix, start):
    for name in ("a", "b"):
        save_figure(plot_map(grid, "mean(q)", x="D", y="T"), tmp_path / f"{name}.{suffix}")
    first = (tmp_path / f"a.{suffix}").read_bytes()
    assert first.startswith(start) and len(first) > 3000
    assert first == (tmp_path / f"b.{suffix}").read_bytes()
    assert not any(word in first for word in (b"CreationDate", b"dc:date", b"Software"))


def test_a_figure_is_saved_like_its_axes(grid, tmp_path):
    ax = plot_lines(grid, "mean(q)", along="T")
    save_figure(ax, tmp_path / "a.png")
    save_figure(ax.figure, tmp_path / "b.PNG")
    assert (tmp_path / "a.png").read_bytes() == (tmp_path / "b.PNG").read_bytes()


def test_other_formats_and_places_are_refused(grid, tmp_path):
    ax = plot_lines(grid, "mean(q)", along="T")
    refused(OutputError, lambda: save_figure(ax, tmp_path / "a.pgn"), "'.pgn'", ".svg", "Did you mean '.png'?")
    refused(OutputError, lambda: save_figure(ax, tmp_path / "a" / "b.png"), "no folder")
    refused(ParameterError, lambda: save_figure("figure", tmp_path / "a.png"), "a figure or its axes", "'figure'")


@pytest.mark.parametrize(
    ("act", "fragments"),
    [
        (lambda g: plot_lines(g), ("several readings", "specific_heat")),
        (lambda g: plot_lines(g, "specific_heta"), ("specific_heta", "Did you mean 'specific_heat'?")),
        (lambda g: plot_lines(g, "mean(q)", along="t"), ("along='t'", "Did you mean 'T'?")),
        (lambda g: plot_lines(g, "mean(q)", along="T", at={"T": 1}), ("at={'T'", "shown whole")),
        (lambda g: plot_lines(g, "mean(q)", along="T", at={"d": 1}), ("at={'d'", "Did you mean 'D'?")),
        (lambda g: plot_lines(g, "mean(q)", along="T", events=[]), ("maps the value of the second axis",)),
        (lambda g: plot_lines({"T": [1]}, "mean(q)"), ("drawn from a Grid",)),
        (lambda g: plot_lines(g, "mean(q)", ax=3), ("matplotlib axes", "3")),
        (lambda g: plot_map(g, "mean(q)", x="D", y="D"), ("both 'D'",)),
        (lambda g: plot_map(g, "mean(q)", x="h"), ("x='h'", "T, D")),
        (lambda g: plot_map(g, "mean(q)", events=[1]), ("events= of a map", "[1]")),
        (lambda g: plot_map(g, "mean(q)", events={1.0: [1]}), ("crossovers(…)",)),
        (
            lambda g: plot_map(g, "mean(q)", events={1.0: [Event("disorder point", "h", 0, 0, 0, 0)]}),
            ("along 'h'", "no axis of this map"),
        ),
        (lambda g: plot_gaps(CHAIN.fix(D=1), k=0), ("k is a whole number", "got 0")),
        (lambda g: plot_gaps(CHAIN.fix(D=1), points=1), ("points", ">= 2")),
        (lambda g: plot_gaps(CHAIN), ("no value for D",)),
        (lambda g: plot_events(None, []), ("existing axes",)),
        (lambda g: plot_events(Figure().add_subplot(), ["peak"]), ("crossovers(…)", "peak")),
    ],
)
def test_refusals(grid, act, fragments):
    refused(ParameterError, lambda: act(grid), *fragments)


def test_axes_too_many_are_named():
    grid = scan(CHAIN, {"T": [1, 2, 3], "D": [0, 1], "h": [0, 1]}, ["entropy"])
    refused(ParameterError, lambda: plot_lines(grid, along="T"), "D, h", "at={'h': …}")
    refused(ParameterError, lambda: plot_map(grid), "'h'", "2 values", "at={'h': …}")
    assert len(plot_lines(grid, along="T", at={"h": 0.9}).lines) == 2
    refused(ParameterError, lambda: plot_map(scan(CHAIN.fix(D=0), {"T": [1, 2]}, ["entropy"])), "a map needs two")


def test_a_map_of_nothing_is_refused():
    grid = scan(CHAIN.fix(T=0), {"D": [0, 1], "h": [0, 1]}, ["entropy"])
    refused(ParameterError, lambda: plot_map(grid), "every point", "'entropy'")


def test_without_matplotlib_the_extra_is_named(monkeypatch, grid):
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    refused(MissingExtra, lambda: plot_lines(grid, "mean(q)", along="T"), "tmsolve[plot]")
