"""Configurations as files."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import Any

from .grids import write_rows

__all__ = ["tell_written", "write"]


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


def tell_written(arguments: argparse.Namespace) -> None:
    """Say which files were written."""
    for path in (arguments.write_realisation, arguments.out):
        if path is not None and not arguments.quiet:
            print(f"tmsolve sample: wrote {path}", file=sys.stderr)
