"""What ``tmsolve sample`` is asked to draw: a point, a length, a seed, and values that differ from cell to cell."""

from __future__ import annotations

import argparse
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import listing
from .files import check_output
from .model import Values, fill, given_values
from .outcome import UsageError
from .parser import Parser
from .random_laws import add_random, read_random
from .realised_files import add_realisation, read_columns, whole_cells, write_columns
from .together import refuse_beside, refuse_without
from .words import whole

if TYPE_CHECKING:
    from ..declare import Point
    from ..disorder.laws import Law
    from ..models import LoadedModel

__all__ = ["Request", "add_cell_values", "read_request"]

_ENDLESS = "values cell by cell belong to a ring or an open chain, the infinite chain has cells without end"
_IDLE_BESIDE_INFINITE = {
    "open": "N cells of the infinite chain have no free ends",
    "realisation": _ENDLESS,
    "random": _ENDLESS,
}


@dataclass(frozen=True)
class Request:
    """Everything that exact samples and simulations have in common.

    Attributes
    ----------
    values : Values
        Parameters that are the same in every cell.
    listed : mapping of str to list
        Parameters that differ from cell to cell.
    laws : mapping of str to Law
        Those of them that were drawn, and from what.
    seed : int or None
        Seed of everything that is drawn; None where it need not be repeatable.
    out : Path or None
        File for the configurations.
    """

    arguments: argparse.Namespace
    model: LoadedModel
    values: Values
    cells: int
    listed: Mapping[str, list[float]]
    laws: Mapping[str, Law]
    seed: int | None
    out: Path | None

    @property
    def point(self) -> Point:
        """The point; parameters that differ from cell to cell stand there with their value in cell 0."""
        first = {name: column[0] for name, column in self.listed.items()}
        return self.model.chain.at(**self.values.numbers, **first)

    @property
    def boundary(self) -> str:
        """How the chain ends."""
        return "open" if self.arguments.open else "infinite" if self.arguments.infinite else "ring"

    @property
    def lines(self) -> list[str]:
        """What differs from cell to cell, in words."""
        read = [name for name in self.listed if name not in self.laws]
        found = [f"  {listing(read)} from {self.arguments.realisation}"] if read else []
        return found + [f"  {name} ~ {law}, one realisation, seed {self.seed}" for name, law in self.laws.items()]

    def document(self) -> dict[str, Any]:
        """Return what was asked for, for JSON."""
        return {
            "command": "sample",
            "model": self.model.name,
            "title": self.model.chain.name,
            "options": dict(self.model.options),
            **self.values.document(),
            "random": {name: str(law) for name, law in self.laws.items()},
            "realisation": list(self.listed),
            "drawn": {name: self.listed[name] for name in self.laws},
            "cells": self.cells,
            "boundary": self.boundary,
            "seed": self.seed,
        }


def add_cell_values(parser: Parser) -> None:
    """Add the options for parameters that differ from cell to cell."""
    add_realisation(parser, "draw configurations of one given disordered chain")
    add_random(
        parser,
        ". Every cell draws its value once, from --seed; all configurations are of that one chain. For averages over "
        "many chains: tmsolve disorder",
    )
    parser.add_argument(
        "--write-realisation",
        metavar="FILE.csv",
        help="write what --random drew, in the form that --realisation reads",
    )


def read_request(arguments: argparse.Namespace, model: LoadedModel) -> Request:
    """Read length, seed and values, and draw what is random among them.

    Raises
    ------
    UsageError
        They cannot be used, or not together.
    """
    out = check_output(arguments.out, "--out", (".csv", ".npz"))
    written = check_output(arguments.write_realisation, "--write-realisation", (".csv",))
    _refuse(arguments)
    listed = read_columns(arguments, model) if arguments.realisation is not None else {}
    laws = read_random(arguments, model)
    for name in laws:
        if name in listed:
            raise UsageError(f"--random {name}: {name} is a column of {arguments.realisation}; leave one of them out")
    cells = whole_cells(arguments, listed, "sample needs the number of cells, such as --cells 100")
    seed = None if arguments.seed is None else whole(arguments.seed, "--seed", 0)
    values = fill(given_values(arguments, model), model, running=(*listed, *laws))
    if laws:
        seed = _own_seed() if seed is None else seed
        listed = {**listed, **_drawn(model, laws, cells, seed)}
    if written is not None:
        write_columns(written, listed, "--write-realisation")
    return Request(arguments, model, values, cells, listed, laws, seed, out)


def _refuse(arguments: argparse.Namespace) -> None:
    if arguments.infinite:
        refuse_beside(arguments, "--infinite", _IDLE_BESIDE_INFINITE)
    if not arguments.random:
        refuse_without(arguments, "--random NAME=LAW", ("write-realisation",))


def _own_seed() -> int:
    import numpy as np

    return int(np.random.default_rng().integers(2**32))


def _drawn(model: LoadedModel, laws: Mapping[str, Law], cells: int, seed: int) -> dict[str, list[float]]:
    """Draw one value per cell and parameter, from a stream apart from that of the configurations."""
    import numpy as np

    for name in laws:
        many = sum(name in term.parameters for term in model.chain.terms)
        if many > 1:
            raise UsageError(
                f"--random {name}: {many} terms of a cell take {name} and would each draw a value of their own, but a "
                "realisation has one per cell; give the terms parameters of different names, or values with "
                "--realisation FILE.csv, which all of them share"
            )
    rng = np.random.default_rng([seed, 1])
    return {name: np.asarray(law.draw(rng, cells), dtype=np.float64).tolist() for name, law in laws.items()}
