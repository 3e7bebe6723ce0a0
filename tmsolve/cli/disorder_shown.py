"""Results of ``tmsolve disorder`` as text and JSON: what was averaged over what."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from .layout import heading
from .model import Values

if TYPE_CHECKING:
    from ..disorder.averages import Average
    from ..models import LoadedModel

__all__ = ["head", "origin", "shown"]

#: Means are known to the rounding of doubles, not better.
_ROUNDING = 1e-15


def shown(name: str, average: Average) -> str:
    """Return an average with the error of its last digits; a mean below the rounding of doubles is 0."""
    nothing = name.startswith("mean(") and max(abs(average.value), average.error) < _ROUNDING
    return "0" if nothing else str(average)


def head(model: LoadedModel, values: Values, laws: Mapping[str, Any], facts: Mapping[str, Any]) -> str:
    """Return the lines above the numbers."""
    lines = [heading(model, values), *(f"  {name} ~ {law}" for name, law in laws.items())]
    if facts:
        lines.append(f"  {facts['replicas']} replicas of {facts['cells']} cells, seed {facts['seed']}")
    return "\n".join(lines)


def origin(
    arguments: argparse.Namespace, model: LoadedModel, values: Values, laws: Mapping[str, Any]
) -> dict[str, Any]:
    """Return what was asked for, for JSON."""
    return {
        "command": "disorder",
        "model": model.name,
        "title": model.chain.name,
        "options": dict(model.options),
        **values.document(),
        "random": {name: str(law) for name, law in laws.items()},
        "method": arguments.method or "sample",
    }
