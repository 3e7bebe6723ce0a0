"""Libraries that only an extra installs."""

import sys

import pytest

from tmsolve._optional import require
from tmsolve.errors import MissingExtra


def test_the_module_itself_is_returned():
    assert require("xml.dom.minidom", extra="plot") is sys.modules["xml.dom.minidom"]


def test_a_missing_library_names_the_extra_and_the_command():
    with pytest.raises(
        MissingExtra, match=r"no_such_library.* is not installed.*'plot'.*pip install \"tmsolve\[plot\]\""
    ):
        require("no_such_library.part", extra="plot")


def test_it_is_an_import_error_with_its_cause():
    with pytest.raises(ImportError) as caught:
        require("no_such_library", extra="data")
    assert isinstance(caught.value.__cause__, ModuleNotFoundError)


def test_a_broken_library_is_told_from_a_missing_one(tmp_path, monkeypatch):
    (tmp_path / "half_installed.py").write_text("import a_part_that_is_gone\n")
    monkeypatch.syspath_prepend(tmp_path)
    with pytest.raises(
        MissingExtra, match=r"half_installed is installed but cannot be imported.*a_part_that_is_gone"
    ):
        require("half_installed", extra="plot")
