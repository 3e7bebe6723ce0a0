"""The ``--random`` option: laws of random parameters."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from ..errors import DeclarationError, ParameterError
from .model import check_names
from .outcome import UsageError
from .parser import Parser
from .realised_files import refuse_parameters
from .words import assignments

if TYPE_CHECKING:
    from ..disorder.laws import Law
    from ..models import LoadedModel

__all__ = ["add_random", "read_random"]


def add_random(parser: Parser, more: str) -> None:
    """Add --random."""
    parser.add_argument(
        "--random",
        metavar="NAME=LAW",
        action="append",
        default=[],
        help="a random parameter: normal(MEAN,DEVIATION), uniform(LOW,HIGH) or choice(VALUE:PROBABILITY,…), in "
        f"quotes; repeatable{more}",
    )


def read_random(arguments: argparse.Namespace, model: LoadedModel) -> dict[str, Law]:
    """Read the laws of --random.

    Raises
    ------
    UsageError
        No such parameter, no such law, or a parameter that has a value by -p.
    """
    from ..disorder.laws import as_law

    given = assignments(arguments.random, "--random", "h=normal(0,1)")
    check_names(given, model, "--random")
    laws = {}
    for name, written in given.items():
        if name == "T":
            raise UsageError("--random T: one temperature holds for the whole chain; give -p T=…")
        try:
            laws[name] = as_law(written)
        except (DeclarationError, ParameterError) as error:
            raise UsageError(f"--random {name}: {error}{_hint(name, written)}") from error
    refuse_parameters(arguments, laws, "random")
    return laws


def _hint(name: str, written: str) -> str:
    """Say what was probably meant by a text that is no law."""
    if written.lower().endswith(".csv"):
        return f" For values from a file: --realisation {written}, with a column {name}"
    if "=" in written.partition(")")[2]:
        return " Every random parameter has its own --random"
    if "(" not in written:
        return f" For one number in all cells: -p {name}=0.5"
    return ""
