"""What the package imports is what it declares to need."""

import ast
import re
import sys
import tomllib

from tests.house_graph import ROOT, modules, tree

# Libraries whose import name differs from the name they are installed under.
IMPORT_NAMES = {"python-flint": "flint"}
# sympy is built on mpmath and brings the version that fits it.
BROUGHT_BY_SYMPY = {"mpmath"}


def declared():
    """Import names of the core dependencies, and of those of each extra."""
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]

    def names(requirements):
        bare = (re.match(r"[\w-]+", text)[0] for text in requirements)
        return {IMPORT_NAMES.get(name, name) for name in bare}

    extras = {extra: names(texts) for extra, texts in project["optional-dependencies"].items()}
    return names(project["dependencies"]), extras


def imported():
    """Map every library outside the standard one that the package imports to the modules that do."""
    found = {}
    for module in modules():
        for node in ast.walk(tree(module)):
            roots = []
            if isinstance(node, ast.Import):
                roots = [alias.name.partition(".")[0] for alias in node.names]
            elif isinstance(node, ast.ImportFrom) and not node.level:
                roots = [node.module.partition(".")[0]]
            for root in set(roots) - sys.stdlib_module_names - {"tmsolve"}:
                found.setdefault(root, set()).add(module)
    return found


def test_every_import_is_declared():
    core, extras = declared()
    users = set().union(*(extras[extra] for extra in ("plot", "certified", "cluster", "data")))
    assert imported().keys() <= core | BROUGHT_BY_SYMPY | users


def test_the_core_dependencies_are_used():
    core, _ = declared()
    assert core == {"numpy", "scipy", "sympy", "networkx"}
    assert core <= imported().keys()


def test_an_extra_names_only_libraries_that_the_core_does_not_bring():
    core, extras = declared()
    for extra, libraries in extras.items():
        assert libraries and not libraries & core, extra
