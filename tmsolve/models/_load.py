"""From a shipped name or a file to a chain with its defaults and facts."""

from __future__ import annotations

import inspect
import os
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from types import ModuleType
from typing import Any

from ..declare import Chain
from ..errors import DeclarationError, did_you_mean, listing
from ._execute import execute, users_line
from ._names import shipped
from ._options import bind_options


@dataclass(frozen=True)
class LoadedModel:
    """A model as its file gives it, with the options it was built with.

    Attributes
    ----------
    chain
        The declared chain.
    defaults
        Parameter values (``"T"`` included) at which the model is worth looking at.
    facts
        Known results: mappings with at least ``id``, ``statement``, ``value`` and ``source``.
    options
        Value of every option, given or by default; empty for a model without options.
    name
        Shipped name, or the stem of the file.
    doc
        Docstring of the file.
    source
        The file.
    """

    chain: Chain
    defaults: Mapping[str, Any]
    facts: tuple[Mapping[str, Any], ...]
    options: Mapping[str, Any]
    name: str
    doc: str
    source: Path


def load(name_or_path: str | os.PathLike[str], **options: Any) -> LoadedModel:
    """Load a shipped model by name or a model file of your own by its path (ending in ``.py``).

    A file is run anew at every call, so that an edit is seen by the next one.

    Parameters
    ----------
    name_or_path
        One of `names` or a path.
    options
        Arguments of the file's ``chain`` function. Texts are converted by the type of the argument's default.

    Raises
    ------
    DeclarationError
        No such model or file; the file does not run (the message shows its line), defines no chain, or does
        not take the options.

    Examples
    --------
    >>> model = load("clock", q="4")
    >>> model.options, len(model.chain.cell["s"])
    ({'q': 4}, 4)
    """
    path = _find(name_or_path)
    module = execute(path)
    chain, values = _build(module, path, options)
    return LoadedModel(
        chain=chain,
        defaults=_defaults(module, chain, path),
        facts=_facts(module, path),
        options=values,
        name=path.stem,
        doc=inspect.cleandoc(module.__doc__ or ""),
        source=path,
    )


def _find(name_or_path: str | os.PathLike[str]) -> Path:
    text = os.fspath(name_or_path)
    if isinstance(name_or_path, os.PathLike) or text.endswith(".py") or Path(text).name != text:
        return Path(text).expanduser().resolve()
    models = shipped()
    if text in models:
        return models[text]
    local = f" The file {text}.py is here: write {text}.py." if Path(f"{text}.py").is_file() else ""
    raise DeclarationError(
        f"no shipped model {text!r}; there are {listing(models)}; a file of your own is given by its path, "
        f"ending in .py.{did_you_mean(text, models)}{local}"
    )


def _build(module: ModuleType, path: Path, options: Mapping[str, Any]) -> tuple[Chain, dict[str, Any]]:
    constant, function = getattr(module, "CHAIN", None), getattr(module, "chain", None)
    if constant is not None and callable(function):
        raise DeclarationError(f"{path} defines both CHAIN and chain(); keep one of them")
    if callable(function):
        values = bind_options(function, options, path.stem)
        with users_line(path):
            made = function(**values)
        return _checked(made, f"chain() of {path} returned"), values
    if constant is None:
        near = " (it defines 'chain' as a value; call that CHAIN)" if function is not None else ""
        raise DeclarationError(f"{path} defines no chain: write CHAIN = Chain(...) or def chain(): ...{near}")
    made = _checked(constant, f"CHAIN of {path} is")
    if options:
        raise DeclarationError(f"model {path.stem} takes no options, got {listing(options)}")
    return made, {}


def _checked(made: Any, what: str) -> Chain:
    if not isinstance(made, Chain):
        raise DeclarationError(f"{what} {made!r}, which is no Chain")
    return made


def _defaults(module: ModuleType, chain: Chain, path: Path) -> dict[str, Any]:
    defaults = getattr(module, "DEFAULTS", {})
    if not isinstance(defaults, Mapping):
        raise DeclarationError(f"DEFAULTS of {path} is {defaults!r}; give a mapping of names to values")
    known = [*chain.parameters, "T"]
    for name in defaults:
        if name not in known:
            raise DeclarationError(
                f"DEFAULTS of {path} gives {name!r}, but the chain has {listing(known)}."
                f"{did_you_mean(str(name), known)}"
            )
    return dict(defaults)


def _facts(module: ModuleType, path: Path) -> tuple[Mapping[str, Any], ...]:
    facts = getattr(module, "FACTS", ())
    if not isinstance(facts, (tuple, list)) or not all(isinstance(fact, Mapping) for fact in facts):
        raise DeclarationError(f"FACTS of {path} must be a tuple of mappings")
    return tuple(facts)
