"""Options that several commands share, with the same meaning everywhere."""

from __future__ import annotations

import argparse

from .parser import Parser
from .together import refuse_beside
from .words import whole

__all__ = [
    "add_axis",
    "add_common",
    "add_digits",
    "add_model",
    "add_out",
    "add_plot",
    "add_read",
    "digits_of",
]

#: Significant digits of numbers in text tables.
DIGITS = 10


def add_model(parser: Parser, parameters: str) -> None:
    """Add MODEL, -p and --option."""
    parser.add_argument("model", metavar="MODEL", help="a shipped name (see: tmsolve models) or a file ending in .py")
    parser.add_argument("-p", "--parameter", metavar="NAME=VALUE", action="append", default=[], help=parameters)
    parser.add_argument(
        "--option",
        metavar="NAME=VALUE",
        action="append",
        default=[],
        help="an argument of the model's chain(…), such as q=5 of potts; repeatable",
    )


def add_read(parser: Parser, default: str) -> None:
    """Add --read."""
    parser.add_argument(
        "--read",
        metavar="NAME,…",
        action="append",
        default=[],
        help=(
            "quantities, separated by commas: free_energy internal_energy entropy specific_heat mean(a) "
            "susceptibility(a) susceptibility(a,b) temperature_susceptibility(a) correlation_length "
            "correlation_length(a) log_correlation_length log_correlation_length(a) wave_number wave_number(a) "
            "gap; a, b are observables of the model. "
            f"The shell needs quotes around brackets. Default: {default}"
        ),
    )


def add_axis(parser: Parser) -> None:
    """Add --axis."""
    parser.add_argument(
        "--axis",
        metavar="NAME=START:STOP:COUNT[:log]",
        action="append",
        default=[],
        help=(
            "a parameter, or T, that runs over COUNT values, ends included; "
            "':log' spaces them by equal ratios; repeatable"
        ),
    )


def add_out(parser: Parser, help_: str) -> None:
    """Add --out."""
    parser.add_argument("--out", metavar="PATH", help=help_)


def add_plot(parser: Parser, help_: str) -> None:
    """Add --plot."""
    parser.add_argument("--plot", metavar="PATH", help=f"{help_}; .png, .svg or .pdf (needs the extra 'plot')")


def add_digits(parser: Parser, default: str = f"{DIGITS} in tables", highest: int = 17) -> None:
    """Add --digits."""
    more = "; more than 17 are computed with longer numbers" if highest > 17 else ""
    parser.add_argument(
        "--digits", metavar="N", help=f"significant digits that are printed, 1 to {highest}{more}. Default: {default}"
    )


def add_common(parser: Parser) -> None:
    """Add --json and --quiet."""
    parser.add_argument(
        "--json",
        action="store_true",
        help=(
            "print one JSON document and nothing else; numbers in full; inf and NaN are null and listed "
            'under "nonfinite"; a failure is {"error": {"kind", "message"}, "exit_code"}'
        ),
    )
    parser.add_argument("--quiet", action="store_true", help="nothing on stderr but errors")


def digits_of(arguments: argparse.Namespace, default: int = DIGITS, highest: int = 17) -> int:
    """Return how many significant digits are printed.

    Raises
    ------
    UsageError
        No such number, or digits of tables beside --json, which has none.
    """
    if arguments.json and highest <= 17:
        refuse_beside(arguments, "--json", {"digits": "JSON holds numbers in full"})
    return default if arguments.digits is None else whole(arguments.digits, "--digits", 1, highest)
