"""The front door: what importing tmsolve loads, and what a name or a misspelt one gives."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import tmsolve

SLOW = {"numpy", "scipy", "sympy", "networkx", "matplotlib", "mpmath", "pandas", "xarray"}


def loaded_by(program):
    """Names of all modules that a fresh interpreter has loaded after a program."""
    report = "\nimport sys; print(*sys.modules)"
    run = subprocess.run(
        [sys.executable, "-c", program + report], capture_output=True, text=True, timeout=120
    )
    assert run.returncode == 0, run.stderr
    return set(run.stdout.split())


def libraries(modules):
    """Those of the slow libraries that are among the modules."""
    return {name.partition(".")[0] for name in modules} & SLOW


def test_importing_the_package_loads_no_library_and_no_room():
    loaded = loaded_by("import tmsolve")
    assert not libraries(loaded)
    assert {name for name in loaded if name.startswith("tmsolve")} == {"tmsolve", "tmsolve._version"}


def test_declaring_and_binding_a_chain_loads_no_library():
    loaded = loaded_by(
        "from tmsolve import Chain, ising, bond\n"
        "Chain(ising(), [bond(lambda s, t, J: -J*s*t)]).at(T='0.5', J=1)"
    )
    assert "tmsolve.declare" in loaded
    assert not libraries(loaded)


def test_solving_a_small_chain_loads_numpy_only():
    loaded = loaded_by(
        "from tmsolve import Chain, bond, solve, spins\n"
        "chain = Chain(spins(1), [bond(lambda s, t, J: -J*s*t)], observables={'m': lambda s: s})\n"
        "r = solve(chain.at(T=1, J=1))\n"
        "r.free_energy; r.specific_heat; r.susceptibility('m'); r.correlation_length('m')"
    )
    assert libraries(loaded) == {"numpy"}


def test_the_table_of_names_is_what_type_checkers_see():
    tree = ast.parse(Path(tmsolve.__file__).read_text(encoding="utf-8"))
    guard = next(node for node in tree.body if isinstance(node, ast.If))
    seen = {alias.asname: node.module for node in guard.body for alias in node.names}
    assert all(alias.asname == alias.name for node in guard.body for alias in node.names)
    rooms = {name for name, home in seen.items() if home is None}
    assert rooms == set(tmsolve._ROOMS)
    assert {name: home for name, home in seen.items() if name not in rooms} == tmsolve._HOME_OF


@pytest.mark.parametrize("name", tmsolve.__all__)
def test_every_name_of_the_front_door_opens(name):
    assert getattr(tmsolve, name) is not None
    assert name in dir(tmsolve)


def test_importing_everything_by_star_gives_the_names():
    space = {}
    exec("from tmsolve import *", space)
    assert set(tmsolve.__all__) <= space.keys()


def test_rooms_open_as_attributes():
    program = "import tmsolve; print(tmsolve.errors.TmsolveError.__name__, len(tmsolve.models.names()) > 5)"
    run = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True, timeout=60
    )
    assert run.stdout.split() == ["TmsolveError", "True"]


def test_a_misspelt_name_is_answered_with_the_nearest():
    with pytest.raises(AttributeError, match=r"no attribute 'solv'.*Did you mean 'solve'\?"):
        tmsolve.solv
    with pytest.raises(ImportError, match="colors"):
        exec("from tmsolve import colors", {})
    assert not hasattr(tmsolve, "__wrapped__")


def test_the_version_is_that_of_the_installed_distribution():
    metadata = pytest.importorskip("importlib.metadata")
    try:
        installed = metadata.version("tmsolve")
    except metadata.PackageNotFoundError:
        pytest.skip("tmsolve is not installed, only on the path")
    assert tmsolve.__version__ == installed
