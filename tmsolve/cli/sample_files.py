"""Configurations as files."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from .grids import write_rows

__all__ = ["write"]


def write(path: Path, states: dict[str, Any], labels: dict[str, Any]) -> None:
    """Write configurations: labels as CSV, one row per configuration, or state numbers by kind as NumPy arrays."""
    import numpy as np

    if path.suffix.lower() == ".npz":
        with path.open("wb") as stream:
            np.savez_compressed(stream, **states)
        return
    cells = range(next(iter(states.values())).shape[1])
    columns = [f"{kind}[{cell}]" for cell in cells for kind in states]
    rows = np.stack(list(labels.values()), axis=-1).reshape(len(next(iter(labels.values()))), -1)
    with path.open("w", encoding="utf-8", newline="") as stream:
        write_rows([columns, *rows.tolist()], stream)
