"""The house itself: one-way imports, sizes, documentation, and what may lie where."""

import ast
import importlib
import inspect
import re
import subprocess
import types

import pytest

import tmsolve
from tests.house_graph import PACKAGE, ROOT, ROW_OF, imports, loaded_at_once, modules, room, tree

VERBS = (
    "solve describe closed_form ground_state phase_diagram ring open_chain certify sample quenched scan "
    "crossovers atlas fit report counts zeros series decimate strip"
).split()
MATHEMATICS = {"operators", "maxplus", "symmetry", "eigen"}
DECLARATION = {"declare", "tabulate", "assemble"}
SLOW_LIBRARIES = {
    "scipy",
    "sympy",
    "networkx",
    "matplotlib",
    "mpmath",
    "pandas",
    "xarray",
    "flint",
    "cloudpickle",
}
TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "LICENSE",
    "tmsolve",
    "tests",
    "models",
    "examples",
}


def listed(offences):
    return "\n".join(str(offence) for offence in offences)


# --- who may import whom


def test_every_room_has_its_row():
    assert {room(module) for module in modules()} <= ROW_OF.keys()


def test_rooms_import_only_from_rows_above():
    wrong = [
        edge
        for edge in imports()
        if room(edge.importer) != room(edge.imported)
        and ROW_OF[room(edge.imported)] >= ROW_OF[room(edge.importer)]
    ]
    assert len(imports()) > 20
    assert not wrong, listed(wrong)


def test_mathematics_knows_no_physics_and_declarations_no_eigen_solver():
    wrong = [
        edge
        for edge in imports()
        if room(edge.importer) in MATHEMATICS and room(edge.imported) in DECLARATION
    ]
    wrong += [
        edge for edge in imports() if room(edge.importer) in DECLARATION and room(edge.imported) == "eigen"
    ]
    assert not wrong, listed(wrong)


def test_nobody_imports_from_the_package_root_or_from_the_front_of_the_own_room():
    wrong = [
        edge
        for edge in imports()
        if edge.imported == "tmsolve" or (edge.imported == f"tmsolve.{room(edge.importer)}" != edge.importer)
    ]
    assert not wrong, listed(wrong)


def test_no_module_imports_itself_through_others():
    edges = {}
    for edge in imports():
        if not edge.only_types:
            edges.setdefault(edge.importer, set()).add(edge.imported)
    done, cycles = set(), []

    def visit(module, path):
        if module in path:
            cycles.append(" -> ".join([*path[path.index(module) :], module]))
        elif module not in done:
            for other in sorted(edges.get(module, ())):
                visit(other, [*path, module])
            done.add(module)

    for module in modules():
        visit(module, [])
    assert not cycles, listed(cycles)


def test_no_import_hides_in_a_string():
    allowed = {"__init__", "_optional", "cli"}
    wrong = [
        f"{module} line {node.lineno}"
        for module in modules()
        if room(module) not in allowed
        for node in ast.walk(tree(module))
        if isinstance(node, ast.Call) and re.search(r"\b(import_module|__import__)$", ast.unparse(node.func))
    ]
    assert not wrong, listed(wrong)


@pytest.mark.parametrize("module", modules())
def test_slow_libraries_are_loaded_inside_functions(module):
    assert not loaded_at_once(module) & SLOW_LIBRARIES


# --- names


def test_no_room_bears_the_name_of_a_verb():
    rooms = {entry.stem for entry in PACKAGE.iterdir()}
    assert "errors" in rooms
    assert not rooms & set(VERBS)


def test_the_front_door_gives_functions_and_classes_after_everything_is_imported():
    for module in modules():
        if not module.endswith("__main__"):
            importlib.import_module(module)
    for name in tmsolve.__all__:
        assert not isinstance(getattr(tmsolve, name), types.ModuleType), name


# --- sizes


@pytest.mark.parametrize("module", modules())
def test_files_are_at_most_300_lines(module):
    assert len(modules()[module].read_text(encoding="utf-8").splitlines()) <= 300


@pytest.mark.parametrize("module", modules())
def test_functions_are_at_most_50_lines(module):
    long = {}
    for node in ast.walk(tree(module)):
        if isinstance(node, (ast.FunctionDef, ast.AsyncFunctionDef)):
            text = ast.get_docstring(node, clean=False)
            length = node.end_lineno - node.lineno + 1 - (len(text.splitlines()) if text else 0)
            if length > 50:
                long[node.name] = length
    assert not long


# --- documentation


@pytest.mark.parametrize("module", modules())
def test_public_names_are_documented(module):
    bare = [] if ast.get_docstring(tree(module)) else ["the module itself"]
    for node in tree(module).body:
        if isinstance(node, (ast.FunctionDef, ast.ClassDef)) and not node.name.startswith("_"):
            members = node.body if isinstance(node, ast.ClassDef) else []
            bare += [
                item.name
                for item in [node, *members]
                if isinstance(item, (ast.FunctionDef, ast.ClassDef))
                and not item.name.startswith("_")
                and not ast.get_docstring(item)
            ]
    assert not bare


def test_the_front_door_is_documented():
    for name in tmsolve.__all__:
        value = getattr(tmsolve, name)
        if not isinstance(value, str):
            assert len(inspect.getdoc(value)) > 20, name


# --- what lies where


def tracked():
    run = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True)
    if run.returncode or not run.stdout:
        pytest.skip("not a git checkout")
    return [name for name in run.stdout.splitlines() if (ROOT / name).is_file()]


def test_the_top_level_holds_what_it_may():
    assert {name.split("/")[0] for name in tracked() if not name.startswith(".")} <= TOP_LEVEL


def test_no_words_that_do_not_belong():
    # Spelt in pieces, so that this file passes its own test.
    words = ["TO" + "DO", "FIX" + "ME", "XX" + "X", "/wo" + "rk/", "/tm" + "p/", "/ro" + "ot/", "/ho" + "me/"]
    words += ["py" + "pi.org", "python" + "hosted", "NotImplemented" + "Error"]
    pattern = re.compile("|".join(rf"(?<!\w){re.escape(word)}" for word in words))
    found = []
    for name in tracked():
        text = (ROOT / name).read_bytes().decode("utf-8", errors="ignore")
        found += [
            f"{name}:{i}: {line.strip()}"
            for i, line in enumerate(text.splitlines(), 1)
            if pattern.search(line)
        ]
    assert not found, listed(found)


def test_the_models_folder_is_no_package():
    assert not (ROOT / "models" / "__init__.py").exists()
