"""An argument parser whose errors say what was got, what was expected and what to do."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import Any, NoReturn

from .._version import __version__
from ..errors import did_you_mean
from .outcome import UsageError

__all__ = ["Parser"]


class _Layout(argparse.RawDescriptionHelpFormatter):
    """Texts before and after the options keep their lines."""

    def __init__(self, prog: str) -> None:
        super().__init__(prog, max_help_position=28)


class _Once(argparse.Action):
    """Store a value; a second one would silently replace the first, and is refused."""

    def __call__(
        self,
        parser: argparse.ArgumentParser,
        namespace: argparse.Namespace,
        values: str | Sequence[Any] | None,
        option_string: str | None = None,
    ) -> None:
        """Store the value."""
        seen: dict[str, Any] = namespace.__dict__.setdefault("stored", {})
        if option_string is not None and self.dest in seen:
            raise UsageError(f"{option_string} is given twice, {seen[self.dest]} and {values}; keep one of them")
        seen[self.dest] = values
        setattr(namespace, self.dest, values)


class Parser(argparse.ArgumentParser):
    """The parser of one command.

    Parameters
    ----------
    command : str
        Name of the command.
    operands : str
        What follows it in the usage line.
    description, examples : str
        Printed before and after the options by ``--help``.
    """

    def __init__(self, command: str, operands: str, description: str, examples: str) -> None:
        super().__init__(
            prog=f"tmsolve {command}",
            usage=f"tmsolve {command} {operands} [options]",
            description=description,
            epilog=f"examples:\n{examples}",
            formatter_class=_Layout,
            allow_abbrev=False,
            add_help=False,
        )
        self.register("action", None, _Once)
        self.add_argument("-h", "--help", action="help", help="this text")
        self.add_argument(
            "--version", action="version", version=f"tmsolve {__version__}", help="the version of tmsolve"
        )

    def read(self, words: list[str]) -> argparse.Namespace:
        """Parse the words after the command; ``command_line`` of the result holds all of them.

        Raises
        ------
        UsageError
            Unknown, missing or surplus words.
        """
        found, surplus = self.parse_known_args(words)
        if surplus:
            raise UsageError(self._surplus(surplus[0]))
        found.command_line = [*self.prog.split(), *words]
        return found

    def _surplus(self, word: str) -> str:
        if not word.startswith("-"):
            if "=" in word:
                return f"{word!r} stands alone; every parameter has its own -p: -p {word}"
            return f"unexpected {word!r}; one MODEL is expected, and values belong to options"
        option = word.partition("=")[0]
        known = [text for action in self._actions for text in action.option_strings if text.startswith("--")]
        return f"no option {option!r}; there are {', '.join(sorted(known))}.{did_you_mean(option, known)}"

    def error(self, message: str) -> NoReturn:
        """Raise what argparse would print before it ends the process."""
        if message.endswith("required: MODEL"):
            message = "no MODEL given; name a shipped one (tmsolve models lists them) or a file ending in .py"
        raise UsageError(message)
