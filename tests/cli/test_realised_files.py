"""CSV files of one realisation: what is read, and what is refused with the line and the way out."""

import argparse

import pytest

from tmsolve import models
from tmsolve.cli.realised_files import read_columns, write_columns
from tmsolve.errors import TmsolveError


@pytest.fixture
def ask(tm, tmp_path):
    """Solve the open chain of a file with these bytes."""

    def run(content, *more, command="disorder", model="random_field_ising"):
        path = tmp_path / "fields.csv"
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
        return tm(command, model, "--realisation", path, *more)

    return run


@pytest.mark.parametrize(
    "content",
    [
        b"\xef\xbb\xbfh,J\n0.5,1\n-1,2\n0.25,1\n",  # a byte order mark
        b"h,J\r\n0.5,1\r\n-1,2\r\n0.25,1\r\n",
        b"h,J\r0.5,1\r-1,2\r0.25,1",
        b"# impurities of an invented crystal\nh,J\n0.5,1\n  # a remark\n-1,2\n0.25,1\n",
        b"\n\nh,J\n0.5,1\n-1,2\n0.25,1\n\n  \n",
        b" h , J \n 0.5 , 1 \n -1,2 \n0.25,1\n",
        b'"h","J"\n"0.5","1"\n-1,2\n0.25,1\n',
        b"cell,h,J\n0,0.5,1\n1,-1,2\n2,0.25,1\n",
        b"J,h\n1,1/2\n2,-1e0\n1,+.25\n",
        "h,J\n0.5,1\n−1,2\n0.25,1\n".encode(),  # a typographic minus
    ],
)
def test_one_chain_in_many_spellings(ask, content):
    plain = ask("h,J\n0.5,1\n-1,2\n0.25,1\n", "--json")
    found = ask(content, "--json")
    assert found.code == 0 and found.json["cells"] == 3
    assert found.json["results"] == plain.json["results"]


@pytest.mark.parametrize(
    ("content", "fragments"),
    [
        ("", ["is empty; the first line names columns after parameters, as in h or h,J"]),
        ("\n  \n", ["is empty"]),
        ("# nothing else\n", ["is empty"]),
        ("h\n", ["has no values below its column names; give one line per cell"]),
        ("h\n1\nabc\n3\n", ["line 3 of", "has 'abc' in column h; give a finite number such as 0.5, 2/5 or 1e-3"]),
        ("# x\nh\n1\n\x41\n", ["line 4 of"]),
        ("h\n1\nNaN\n", ["line 3 of", "'NaN' in column h; give a finite number"]),
        ("h\ninf\n2\n", ["line 2 of", "'inf' in column h; give a finite number"]),
        ("h\n1e400\n2\n", ["'1e400' in column h"]),
        ("h\n1/0\n2\n", ["'1/0' in column h"]),
        ('h\n"0,5"\n2\n', ["'0,5' in column h", "use a point for decimals"]),
        ("h,J\n1,2\n,3\n", ["line 3 of", "has no value in column h"]),
        ("h,J\n1,2\n1\n", ["line 3 of", "has 1 value for the columns h, J; give one for each, with commas"]),
        ("h\n1,2\n", ["has 2 values for the columns h"]),
        ("h\n1\n\n2\n", ["line 3 of", "is empty and more values follow", "or delete the line"]),
        ("h;J\n1;2\n", ["line 1 of", "has semicolons between its columns; save it with commas between columns"]),
        ("h;J\n0,5;1,5\n", ["has semicolons", "points in decimals"]),
        ("h\tJ\n1\t2\n", ["has tabs between its columns"]),
        ("0.5\n1\n", ["line 1 of", "holds numbers, 0.5; the first line names columns after parameters"]),
        ("h,\n1,\n", ["leaves column 2 without a name"]),
        ("h,h\n1,2\n", ["names the column h twice; keep one of them"]),
        ("hh\n1\n", ["column hh: no parameter 'hh'", "has J, H, h, T", "Did you mean 'h'?"]),
        ("T\n1\n", ["column T: one temperature holds for the whole chain; give -p T="]),
        ("cell\n0\n1\n", ["has no column named after a parameter"]),
        ("cell,h\n1,1\n0,2\n", ["the column cell of", "must count 0, 1, 2, … in this order; sort the lines"]),
        ("cell,h\n1,1\n2,2\n", ["must count 0, 1, 2"]),
        ('h\n"1\n2\n', ["cannot be read as CSV"]),
        ("h\n1\n".encode("utf-16"), ["is not UTF-8 text; save it as CSV in UTF-8"]),
        ("h,µ\n1,2\n".encode("latin-1"), ["is not UTF-8 text"]),
    ],
)
@pytest.mark.parametrize("command", ["disorder", "sample", "finite"])
def test_files_that_are_refused(ask, content, fragments, command):
    ended = ask(content, command=command)
    assert ended.code == 2 and ended.out == ""
    for fragment in fragments:
        assert fragment in ended.err
    assert "fields.csv" in ended.err


@pytest.mark.parametrize("command", ["disorder", "sample", "finite"])
def test_what_does_not_go_with_a_column(ask, tm, tmp_path, command):
    ended = ask("h\n1\n2\n", "-p", "h=2", command=command)
    assert ended.code == 2 and "-p h: h is a column of" in ended.err and "leave one of them out" in ended.err
    ended = tm(command, "random_field_ising", "--realisation", tmp_path / "none.csv")
    assert ended.code == 2 and "none.csv cannot be read: No such file" in ended.err
    ended = tm(command, "random_field_ising", "--realisation", tmp_path)
    assert ended.code == 2 and "cannot be read: Is a directory" in ended.err


def test_a_missing_column_takes_the_default_or_is_asked_for(ask, pair):
    ended = ask("h\n1\n2\n")
    assert ended.code == 0 and "J = 1  (default)" in ended.out
    ended = ask("J\n1\n2\n", model=pair)
    assert ended.code == 2 and "no value for h" in ended.err and "give -p h=" in ended.err


def test_a_parameter_named_cell_is_a_parameter(ask, write):
    model = write(
        '"""Invented."""\nfrom tmsolve import Chain, ising, site\n'
        'CHAIN = Chain(ising(), [site(lambda s, cell: -cell*s)], observables={"m": lambda s: s})\n'
        'DEFAULTS = {"cell": 1, "T": 1}\n'
    )
    found = ask("cell\n0.5\n0.5\n", "--json", model=model).json
    assert found["realisation"] == ["cell"]


def test_numbers_come_back_as_they_were(tmp_path):
    values, path = [0.1, -1 / 3, 1e-300, 5e-324, 2.0**60], tmp_path / "own.csv"
    write_columns(path, {"h": values, "J": values[::-1]}, "--out")
    assert path.read_text().splitlines()[:2] == ["cell,h,J", "0,0.1,1.152921504606847e+18"]
    given = argparse.Namespace(realisation=str(path), parameter=[])
    assert read_columns(given, models.load("ising")) == {"h": values, "J": values[::-1]}
    with pytest.raises(TmsolveError, match=r"--out: .* could not be written"):
        write_columns(tmp_path, {"h": values}, "--out")
