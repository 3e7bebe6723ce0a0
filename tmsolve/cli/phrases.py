"""Advice of the Python interface in the words of the command line."""

from __future__ import annotations

import re
from collections.abc import Callable
from fractions import Fraction

from .table import show_exact

__all__ = ["for_command_line"]

_PHRASES: tuple[tuple[str, str | Callable[[re.Match[str]], str]], ...] = (
    (r"chain\.fix\(((?:\w+=…(?:, )?)+)\)", lambda found: f"-p {found[1]}".replace(", ", " -p ")),
    (r"chain\.fix\(…\)", "-p NAME=VALUE"),
    (r"solve\(chain\.at\(…\)\)", "tmsolve solve"),
    (r"\btime_limit\b", "--time-limit"),
    (r"partition_function\(12\)", "--cells 12"),
    (r"partition_function\(N\) with a number", "--cells with a number"),
    (r"(?<!\w)\.recurrence\b", "--quantity recurrence"),
    (r"(?<!\w)\.characteristic_polynomial\b", "--quantity polynomial"),
    (r"Use Dense\(max_size=\d+\), or shorten", "Shorten"),
    (r"box=\{'(\w+)': \(low, high\)\}", r"--axes \1=LOW:HIGH"),
    (r"ground_state\((?:…|chain)\)", "tmsolve ground"),
    (r"give a larger tolerance, or use quenched\(…\)", "take --method sample"),
    (r"use quenched\(…\)", "take --method sample"),
    (r"\b(given|rule|start)=(?= (?!of )|$)", r"--\1"),
    (r"see the attribute of the form", "--quantity prints it"),
    (r"Fraction\((-?\d+), (\d+)\)", lambda found: show_exact(Fraction(int(found[1]), int(found[2])))),
)


def for_command_line(message: str) -> str:
    """Replace what only makes sense in a program by the option that does the same.

    Examples
    --------
    >>> for_command_line("fix parameters with chain.fix(…), or give a longer time_limit")
    'fix parameters with -p NAME=VALUE, or give a longer --time-limit'
    """
    for pattern, words in _PHRASES:
        message = re.sub(pattern, words, message)
    return message
