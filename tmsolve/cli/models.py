"""``tmsolve models``: the shipped models, and what one model declares."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from .jsontext import json_text
from .layout import energy_lines, title
from .model import load_model
from .options import add_common
from .outcome import DONE
from .parser import Parser
from .table import table

if TYPE_CHECKING:
    from ..models import LoadedModel

OPERANDS = "[MODEL]"
DESCRIPTION = """\
Without MODEL: list the shipped models with their energies and options.
With MODEL, a shipped name or a file: its declaration, defaults, cut, matrix size, and known facts with
their sources."""
EXAMPLES = """\
  tmsolve models
  tmsolve models diamond
  tmsolve models potts --option q=5 --json
  tmsolve models my_chain.py
"""


def configure(parser: Parser) -> None:
    """Declare the options."""
    parser.add_argument("model", metavar="MODEL", nargs="?", help="a shipped name or a file ending in .py")
    parser.add_argument(
        "--option",
        metavar="NAME=VALUE",
        action="append",
        default=[],
        help="an argument of the model's chain(…); repeatable",
    )
    add_common(parser)


def run(arguments: argparse.Namespace) -> int:
    """List the models, or describe one."""
    if arguments.model is None:
        listed = _all_models()
        print(json_text({"command": "models", "models": listed}) if arguments.json else _list_text(listed))
        return DONE
    model = load_model(arguments)
    print(json_text(_document(model)) if arguments.json else _model_text(model))
    return DONE


def _all_models() -> list[dict[str, Any]]:
    from ..models._load import load
    from ..models._names import names

    return [_entry(load(name)) for name in names()]


def _entry(model: LoadedModel) -> dict[str, Any]:
    return {
        "model": model.name,
        "title": model.chain.name,
        "energy": " ".join(energy_lines(model)),
        "options": dict(model.options),
        "parameters": list(model.chain.parameters),
        "observables": list(model.chain.observables),
        "defaults": {name: str(value) for name, value in model.defaults.items()},
    }


def _list_text(listed: list[dict[str, Any]]) -> str:
    rows = []
    for entry in listed:
        options = "".join(f"  [--option {name}={value}]" for name, value in entry["options"].items())
        rows += [[entry["model"], entry["title"] + options], ["", entry["energy"]]]
    return (
        table(rows) + "\n\ntmsolve models NAME shows one of them in full; tmsolve solve NAME solves it at its defaults."
    )


def _document(model: LoadedModel) -> dict[str, Any]:
    from dataclasses import asdict

    from ..assemble.describe_chain import describe

    declared = asdict(describe(model.chain))
    entry = {**_entry(model), "fixed": dict(model.chain.fixed), "source": str(model.source), "doc": model.doc}
    return {"command": "models", **entry, "declaration": declared, "facts": list(model.facts)}


def _model_text(model: LoadedModel) -> str:
    from ..assemble.describe_chain import describe

    parts = [title(model), model.doc, str(describe(model.chain)), _defaults_text(model)]
    if model.facts:
        parts.append("known facts\n" + "\n".join(_fact_text(fact) for fact in model.facts))
    return "\n\n".join(part for part in parts if part) + f"\n\nfile: {model.source}"


def _defaults_text(model: LoadedModel) -> str:
    if not model.defaults:
        return "no DEFAULTS: every parameter and T must be given with -p"
    return "defaults: " + "  ".join(f"{name} = {value}" for name, value in model.defaults.items())


def _fact_text(fact: Mapping[str, Any]) -> str:
    point = ", ".join(f"{name} = {value}" for name, value in dict(fact.get("point", {})).items())
    options = ", ".join(f"{name} = {value}" for name, value in dict(fact.get("options", {})).items())
    where = "; ".join(part for part in (options, point) if part)
    lines = [f"  {fact.get('id', 'fact')}: {fact.get('statement', '')}"]
    if "value" in fact:
        lines.append(f"      {_quantity(fact)} = {fact['value']}" + (f"   at {where}" if where else ""))
    if "source" in fact:
        lines.append(f"      source: {fact['source']}")
    return "\n".join(lines)


def _quantity(fact: Mapping[str, Any]) -> str:
    boundary = f" of {fact['cells']} cells, {fact.get('boundary', 'ring')}" if "cells" in fact else ""
    slope = f" by {', '.join(fact['derivative'])}" if "derivative" in fact else ""
    return f"{'derivative of ' if slope else ''}{fact.get('quantity', 'value')}{slope}{boundary}"
