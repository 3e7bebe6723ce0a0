"""What ``--plot`` draws."""

import pytest

pytest.importorskip("matplotlib")


@pytest.fixture
def drawn(monkeypatch):
    """Collect the figures that are saved, by path."""
    import tmsolve.plotting.files as files

    figures, save = [], files.save_figure

    def keeping(figure, path):
        figures.append(figure)
        save(figure, path)

    monkeypatch.setattr(files, "save_figure", keeping)
    return figures


@pytest.mark.parametrize(("suffix", "magic"), [(".png", b"\x89PNG"), (".svg", b"<?xml"), (".pdf", b"%PDF")])
def test_the_file_is_of_the_kind_its_name_says(tm, tmp_path, suffix, magic):
    path = tmp_path / f"c{suffix}"
    ended = tm("scan", "ising", "--axis", "T=0.2:2:9", "--read", "specific_heat", "--plot", path)
    assert ended.code == 0 and f"wrote {path}" in ended.err
    assert path.read_bytes().startswith(magic)
    assert ended.out.startswith("T [energy],specific_heat [k_B]\n")


def test_one_panel_per_quantity(tm, tmp_path, drawn):
    tm("scan", "blume_capel", "--axis", "T=0.05:2:20", "--plot", tmp_path / "all.png")
    (figure,) = drawn
    labels = [ax.get_ylabel() for ax in figure.axes]
    assert len(labels) == 9 and "$c$ [$k_\\mathrm{B}$]" in labels
    scales = dict(zip(labels, (ax.get_yscale() for ax in figure.axes), strict=True))
    assert scales["$\\xi$ [cells]"] == "log" and scales["$f$ [energy]"] == "linear"
    mean = next(ax for ax in figure.axes if "langle m" in ax.get_ylabel())
    assert mean.get_ylim() == (-1, 1)


def test_two_axes_are_lines_or_a_map(tm, tmp_path, drawn):
    words = ["scan", "blume_capel", "--read", "entropy", "--axis", "T=0.1:2:20"]
    tm(*words, "--axis", "D=0.8:1.2:3", "--plot", tmp_path / "lines.png")
    tm(*words, "--axis", "D=0:2:10", "--plot", tmp_path / "map.png")
    lines, map_ = drawn
    assert len(lines.axes) == 1 and len(lines.axes[0].lines) == 3
    assert len(map_.axes) == 2 and map_.axes[0].collections


def test_three_axes_are_refused_before_anything_is_computed(tm, tmp_path):
    words = ["--axis", "T=1:2:3", "--axis", "D=0:2:3", "--axis", "h=0:1:3", "--plot", tmp_path / "a.png"]
    ended = tm("scan", "blume_capel", *words)
    assert ended.code == 2 and ended.out == ""
    assert "--plot draws over one or two axes, got 3: T, D, h" in ended.err


def test_events_are_marked_on_their_curves(tm, tmp_path, drawn):
    words = ["crossovers", "ising_nnn", "-p", "J2=-0.3", "--along", "T=0.1:5", "--json"]
    ended = tm(*words, "--plot", tmp_path / "events.png")
    heat, wave = drawn[0].axes
    peak, disorder = ended.json["events"]
    assert heat.lines[1].get_xdata()[0] == peak["location"]
    assert heat.lines[1].get_ydata()[0] == peak["height"]
    assert wave.get_ylabel().startswith("$k$") and wave.lines[1].get_xdata()[0] == disorder["location"]


def test_without_events_the_specific_heat_is_drawn(tm, tmp_path, drawn):
    ended = tm("crossovers", "ising", "--along", "T=2:5", "--plot", tmp_path / "none.png")
    assert ended.code == 0 and "$c$" in drawn[0].axes[0].get_ylabel()


def test_a_figure_that_cannot_be_drawn_does_not_cost_the_numbers(tm, tmp_path):
    # Free spins: the gap is infinite everywhere, and infinity has no place on a map.
    words = ["--axis", "T=1:2:9", "--axis", "h=-1:1:9", "--read", "gap", "--plot", tmp_path / "gap.png"]
    ended = tm("scan", "ising", "-p", "J=0", *words)
    assert ended.code == 3 and len(ended.out.splitlines()) == 82
    assert "the figure was not drawn: every point of 'gap' failed or is infinite" in ended.err
    assert not (tmp_path / "gap.png").exists()


def test_without_matplotlib_it_is_told_before_anything_is_computed(tm, tmp_path, monkeypatch):
    import sys

    monkeypatch.setitem(sys.modules, "matplotlib", None)
    ended = tm("scan", "ising", "--axis", "T=1:2:3", "--plot", tmp_path / "a.png")
    assert ended.code == 1 and ended.out == ""
    assert "the extra 'plot': python -m pip install \"tmsolve[plot]\"" in ended.err
