"""Both arithmetics: python-flint's balls where installed, and directed rounding with python-flint hidden."""

import importlib.util
import sys

import pytest

HAVE_FLINT = importlib.util.find_spec("flint") is not None
NAMES = ("balls", "rounding")


def use(name, monkeypatch):
    """Let `certify` work with one arithmetic."""
    if name == "rounding":
        monkeypatch.setitem(sys.modules, "flint", None)
    elif not HAVE_FLINT:
        pytest.skip("python-flint is not installed")
