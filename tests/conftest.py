"""Settings of the whole test suite."""

import os

import pytest
from hypothesis import HealthCheck, settings

# Set before anything draws, and inherited by the programs that tests start.
os.environ.setdefault("MPLBACKEND", "Agg")

# On a build machine the same examples every time; at a desk new ones, so that they keep looking for faults.
_COMMON = {"deadline": None, "print_blob": True, "suppress_health_check": [HealthCheck.too_slow]}
settings.register_profile("desk", **_COMMON)
settings.register_profile("ci", derandomize=True, **_COMMON)
settings.load_profile("ci" if os.environ.get("CI") else "desk")


def pytest_addoption(parser):
    """Add ``--runslow``: tests of more than a few seconds run only when asked for."""
    parser.addoption("--runslow", action="store_true", default=False, help="run tests marked slow as well")


def pytest_configure(config):
    """Declare the marker."""
    config.addinivalue_line("markers", "slow: takes more than a few seconds; runs with --runslow")


def pytest_collection_modifyitems(config, items):
    """Skip slow tests unless asked for."""
    if config.getoption("--runslow"):
        return
    for item in items:
        if "slow" in item.keywords:
            item.add_marker(pytest.mark.skip(reason="slow; runs with --runslow"))
