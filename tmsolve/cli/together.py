"""Options that have no effect beside others: refused, not ignored."""

from __future__ import annotations

import argparse
from collections.abc import Iterable, Mapping

from .outcome import UsageError

__all__ = ["is_given", "refuse_beside", "refuse_without"]


def is_given(arguments: argparse.Namespace, option: str) -> bool:
    """Tell whether an option stands on the command line; for options that have no default of their own.

    Examples
    --------
    >>> is_given(argparse.Namespace(write_out=[], cells="0"), "write-out")
    False
    """
    return getattr(arguments, option.replace("-", "_")) not in (None, False, [])


def refuse_beside(arguments: argparse.Namespace, chosen: str, idle: Mapping[str, str]) -> None:
    """Refuse options that would have no effect beside what was chosen.

    Parameters
    ----------
    chosen : str
        What was chosen, as it stands on the command line.
    idle : mapping of str to str
        Options without their hyphens, and why each has no effect.

    Raises
    ------
    UsageError
        One of them is given.
    """
    for option, why in idle.items():
        if is_given(arguments, option):
            raise UsageError(f"--{option} has no effect beside {chosen}: {why}; leave --{option} out")


def refuse_without(arguments: argparse.Namespace, needed: str, options: Iterable[str]) -> None:
    """Refuse options that belong to another one, which is not given.

    Raises
    ------
    UsageError
        One of them is given.
    """
    for option in options:
        if is_given(arguments, option):
            raise UsageError(f"--{option} belongs to {needed}; add {needed}, or leave --{option} out")
