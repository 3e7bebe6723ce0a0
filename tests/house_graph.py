"""Reads the package as text: its modules, what they import and in which row of the house they live."""

import ast
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import tmsolve

PACKAGE = Path(tmsolve.__file__).parent
ROOT = Path(__file__).resolve().parents[1]

# A room may import only from rooms of earlier rows.
ROWS = (
    ("errors", "_version"),
    ("_frozen", "_optional", "units"),
    ("declare", "operators", "maxplus", "symmetry"),
    ("tabulate", "eigen", "models"),
    ("assemble",),
    ("observe", "symbolic", "ground", "disorder"),
    ("answer", "enclose"),
    ("finite", "draw", "survey"),
    ("fitting", "plotting"),
    ("reporting",),
    ("cli",),
    ("__init__", "__main__"),
)
ROW_OF = {room: row for row, rooms in enumerate(ROWS) for room in rooms}


@dataclass(frozen=True)
class Import:
    """One module of the package importing another."""

    importer: str
    imported: str
    line: int
    only_types: bool

    def __str__(self):
        return f"{self.importer} line {self.line} imports {self.imported}"


def room(module):
    """First part of a module's name below the package; the package itself is ``__init__``."""
    return module.split(".")[1] if "." in module else "__init__"


def is_shipped_model(path):
    """Whether a file is one of the model files, which a wheel carries inside the package."""
    return path.parent.name == "models" and not path.stem.startswith("_")


@cache
def modules():
    """Map the dotted name of every module of the package to its file."""
    found = {}
    for path in sorted(PACKAGE.rglob("*.py")):
        if not is_shipped_model(path):
            parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
            found[".".join(parts[:-1] if parts[-1] == "__init__" else parts)] = path
    return found


@cache
def tree(module):
    """Syntax tree of a module."""
    return ast.parse(modules()[module].read_text(encoding="utf-8"))


@cache
def imports():
    """List every import of one module of the package by another, those inside functions included."""
    return [edge for module in modules() for edge in _imports_of(module)]


def _imports_of(module):
    types = {
        id(node) for guard in _type_guards(tree(module)) for part in guard.body for node in ast.walk(part)
    }
    for node in ast.walk(tree(module)):
        if isinstance(node, ast.ImportFrom):
            base = _base(module, node)
            for alias in node.names:
                target = f"{base}.{alias.name}" if f"{base}.{alias.name}" in modules() else base
                if target in modules():
                    yield Import(module, target, node.lineno, id(node) in types)
        elif isinstance(node, ast.Import):
            for alias in node.names:
                if alias.name in modules():
                    yield Import(module, alias.name, node.lineno, id(node) in types)


def _base(module, node):
    if not node.level:
        return node.module
    package = module if modules()[module].name == "__init__.py" else module.rpartition(".")[0]
    for _ in range(node.level - 1):
        package = package.rpartition(".")[0]
    return f"{package}.{node.module}" if node.module else package


def _type_guards(syntax):
    for node in ast.walk(syntax):
        if isinstance(node, ast.If) and ast.unparse(node.test) in ("TYPE_CHECKING", "typing.TYPE_CHECKING"):
            yield node


def loaded_at_once(module):
    """Top-level names of the libraries that a module loads when it is imported."""
    names, pending = set(), list(tree(module).body)
    while pending:
        node = pending.pop()
        if isinstance(node, (ast.FunctionDef, ast.AsyncFunctionDef, ast.Lambda)):
            continue
        if isinstance(node, ast.If) and ast.unparse(node.test) == "TYPE_CHECKING":
            pending.extend(node.orelse)
            continue
        if isinstance(node, ast.Import):
            names.update(alias.name.partition(".")[0] for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and not node.level:
            names.add(node.module.partition(".")[0])
        pending.extend(ast.iter_child_nodes(node))
    return names
