"""Grids: mapping, files that read back bit by bit, frames of other libraries."""

import csv
import json

import numpy as np
import pytest

from tests.refusal import refused
from tests.survey.chains import FROZEN, ISING, WARM
from tmsolve import ParameterError, scan
from tmsolve.survey.grid import Grid
from tmsolve.survey.outputs import OutputError, check_writable


@pytest.fixture(scope="module")
def grid():
    axes = {"T": [0.0, 0.1, 1 / 3, 2.0], "D": [0.7, 1.0, 1.3]}
    return scan(WARM.fix(J=1), axes, ["specific_heat", "susceptibility(m,q)", "correlation_length"])


def same(a, b):
    assert a.dims == b.dims and list(a) == list(b)
    for name in a:
        assert a[name].tobytes() == b[name].tobytes(), name
    assert np.array_equal(a.mask, b.mask) and a.failed == b.failed
    assert dict(a.units) == dict(b.units) and dict(a.symbols) == dict(b.symbols) and dict(a.attrs) == dict(b.attrs)


@pytest.mark.parametrize(("suffix", "read"), [("csv", Grid.from_csv), ("npz", Grid.from_npz)])
def test_files_read_back_bit_by_bit(grid, tmp_path, suffix, read):
    grid.save(tmp_path / f"scan.{suffix}")
    again = read(tmp_path / f"scan.{suffix}")
    same(grid, again)
    assert again.failed[0].coordinates == {"T": 0.0, "D": 0.7}


def test_infinities_and_nan_survive_a_csv(tmp_path):
    def odd(solution):
        return np.where(np.asarray(solution.point.T) > 1.5, np.inf, solution.entropy)

    grid = scan(FROZEN.fix(mu=1), {"T": [0, 1, 2]}, [odd])
    grid.to_csv(tmp_path / "a.csv")
    same(grid, Grid.from_csv(tmp_path / "a.csv"))


def test_a_csv_has_a_plain_header_with_units(grid, tmp_path):
    grid.to_csv(tmp_path / "scan.csv")
    with (tmp_path / "scan.csv").open(newline="") as stream:
        rows = list(csv.reader(stream))
    assert rows[0] == [
        "T [energy]", "D", "specific_heat [k_B]", "susceptibility(m,q) [1/energy]", "correlation_length [cells]",
    ]  # fmt: skip
    assert len(rows) == 13 and rows[4][:2] == ["0.1", "0.7"] and rows[7][0] == repr(1 / 3)
    meta = json.loads((tmp_path / "scan.meta.json").read_text(encoding="utf-8"))
    assert meta["attrs"]["chain"] == "Blume-Capel" and meta["shape"] == [4, 3]


def test_other_readers_take_the_files(grid, tmp_path):
    pandas, xarray = pytest.importorskip("pandas"), pytest.importorskip("xarray")
    grid.to_csv(tmp_path / "scan.csv")
    assert pandas.read_csv(tmp_path / "scan.csv").shape == (12, 5)
    assert np.genfromtxt(tmp_path / "scan.csv", delimiter=",", skip_header=1).shape == (12, 5)
    grid.to_netcdf(tmp_path / "scan.nc")
    opened = xarray.load_dataset(tmp_path / "scan.nc", engine="scipy")
    assert opened["specific_heat"].dims == ("T", "D") and opened["T"].attrs["units"] == "energy"
    assert np.array_equal(opened["specific_heat"], grid["specific_heat"], equal_nan=True)
    with _npz(grid, tmp_path) as stored:
        assert np.array_equal(stored["D"], grid["D"])


def _npz(grid, folder):
    grid.to_npz(folder / "scan.npz")
    return np.load(folder / "scan.npz")


def test_netcdf_is_readable_with_scipy_alone(grid, tmp_path):
    from scipy.io import netcdf_file

    grid.save(tmp_path / "scan.nc")
    with netcdf_file(tmp_path / "scan.nc", mmap=False) as file:
        assert file.dimensions == {"T": 4, "D": 3}
        assert file.variables["susceptibility(m,q)"].units == b"1/energy"
        assert json.loads(file.attrs)["chain"] == "Blume-Capel"


def test_a_tidy_frame(grid):
    pytest.importorskip("pandas")
    frame = grid.to_pandas()
    assert list(frame.columns) == list(grid) and len(frame) == 12
    assert frame["D"].tolist()[:4] == [0.7, 1.0, 1.3, 0.7]
    assert frame.attrs["units"]["T"] == "energy" and frame.attrs["chain"] == "Blume-Capel"


def test_an_xarray_dataset_can_be_written_again(grid, tmp_path):
    pytest.importorskip("xarray")
    data = grid.to_xarray()
    assert data["specific_heat"].sel(T=2.0, D=1.0) == grid["specific_heat"][3, 1]
    assert data["specific_heat"].attrs == {"units": "k_B", "symbol": "c"}
    data.to_netcdf(tmp_path / "again.nc", engine="scipy")


def test_files_of_equal_grids_are_equal(monkeypatch, tmp_path):
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "0")
    for name in ("a", "b"):
        grid = scan(ISING.fix(J=1), {"T": [1, 2]}, ["entropy"])
        for suffix in ("csv", "npz", "nc"):
            grid.save(tmp_path / f"{name}.{suffix}")
    for suffix in ("csv", "npz", "nc", "meta.json"):
        assert (tmp_path / f"a.{suffix}").read_bytes() == (tmp_path / f"b.{suffix}").read_bytes(), suffix


def test_an_axis_may_have_any_name(tmp_path):
    from tmsolve import Chain, ising, site

    chain = Chain(ising(), [site(lambda s, file, self: -(file + self) * s)])
    grid = scan(chain.fix(T=1), {"file": [0, 1], "self": [1, 2]}, ["entropy"])
    for suffix, read in (("npz", Grid.from_npz), ("csv", Grid.from_csv)):
        grid.save(tmp_path / f"a.{suffix}")
        same(grid, read(tmp_path / f"a.{suffix}"))


def test_a_grid_is_a_read_only_mapping(grid):
    assert list(grid) == ["T", "D", "specific_heat", "susceptibility(m,q)", "correlation_length"]
    assert len(grid) == 5 and "T" in grid and "entropy" not in grid and grid.size == 12
    with pytest.raises(ValueError, match="read-only"):
        grid["specific_heat"][0, 0] = 1
    refused(ParameterError, lambda: grid["specific_heta"], "specific_heta", "Did you mean 'specific_heat'?")


def test_what_a_grid_shows(grid):
    assert repr(grid) == (
        "<Grid 'Blume-Capel': T (4) × D (3); specific_heat, susceptibility(m,q), correlation_length, 3 failed>"
    )
    page = grid._repr_html_()
    assert page.count("<tr>") == 11 and "<th>T [energy]</th>" in page and "2 more points" in page


@pytest.mark.parametrize("read", [Grid.from_csv, Grid.from_npz])
def test_missing_files_are_named(read, tmp_path):
    refused(OutputError, lambda: read(tmp_path / "no.csv"), "no.csv", "there is no")


def test_a_csv_needs_its_description(grid, tmp_path):
    grid.to_csv(tmp_path / "scan.csv")
    (tmp_path / "scan.meta.json").unlink()
    refused(OutputError, lambda: Grid.from_csv(tmp_path / "scan.csv"), "scan.meta.json", "needs both")


@pytest.mark.parametrize(
    ("name", "content", "fragment"),
    [
        ("scan.csv", "T [energy]\none\n", "could not convert"),
        ("scan.csv", "T,D\n1,2\n", "was it written by Grid.to_csv?"),
        ("scan.meta.json", "{", "Grid.to_csv"),
        ("scan.meta.json", "{}", "lacks 'dims'"),
    ],
)
def test_damaged_files_are_refused(grid, tmp_path, name, content, fragment):
    grid.to_csv(tmp_path / "scan.csv")
    (tmp_path / name).write_text(content)
    refused(OutputError, lambda: Grid.from_csv(tmp_path / "scan.csv"), "scan.csv", fragment)


def test_a_file_that_is_no_grid_is_refused(tmp_path):
    np.savez(tmp_path / "other.npz", x=np.zeros(2))
    refused(OutputError, lambda: Grid.from_npz(tmp_path / "other.npz"), "other.npz", "Grid.to_npz")
    (tmp_path / "text.npz").write_text("no archive")
    refused(OutputError, lambda: Grid.from_npz(tmp_path / "text.npz"), "text.npz", "Grid.to_npz")


def test_where_files_can_be_written(tmp_path):
    good = check_writable(tmp_path / "new.csv", [".csv"])
    assert good == tmp_path / "new.csv" and not good.exists()
    refused(OutputError, lambda: check_writable(tmp_path), "is a folder")
    refused(OutputError, lambda: check_writable(tmp_path / "a" / "b.csv"), "no folder", "create it first")
    refused(OutputError, lambda: check_writable(tmp_path / "b.cvs", [".csv", ".npz"]), "'.cvs'", "Did you mean '.csv'?")
    refused(OutputError, lambda: check_writable(tmp_path / "b", [".csv"]), "''", ".csv")


def test_permissions_are_looked_at(tmp_path, monkeypatch):
    (tmp_path / "old.csv").write_text("")
    monkeypatch.setattr("os.access", lambda path, mode: False)
    refused(OutputError, lambda: check_writable(tmp_path / "old.csv"), "old.csv", "read-only")
    refused(OutputError, lambda: check_writable(tmp_path / "new.csv"), "new.csv", "no permission")


def test_scan_checks_its_output_before_computing(tmp_path):
    called = []

    def attempt():
        scan(
            ISING.fix(J=1),
            {"T": [1, 2]},
            ["entropy"],
            out=tmp_path / "no" / "a.csv",
            progress=lambda *a: called.append(a),
        )

    refused(OutputError, attempt, "no folder")
    assert not called
    scan(ISING.fix(J=1), {"T": [1, 2]}, ["entropy"], out=tmp_path / "a.npz")
    assert Grid.from_npz(tmp_path / "a.npz").shape == (2,)
