"""From the words of the command line to a command, and from whatever happens to an exit code."""

from __future__ import annotations

import os
import sys

from ..errors import ParameterError, TmsolveError, did_you_mean, listing
from .outcome import CLOSED_PIPE, FAILED, INTERRUPTED, USAGE, UsageError
from .overview import COMMANDS, overview

__all__ = ["call"]


def call(words: list[str]) -> int:
    """Run the command that the words name; every failure becomes a message and an exit code."""
    try:
        _tolerate_narrow_encodings()
        code = _guarded(words)
        sys.stdout.flush()
        return code
    except BrokenPipeError:
        # The interpreter flushes once more at its end, and must not find the closed pipe again.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return CLOSED_PIPE


def _guarded(words: list[str]) -> int:
    try:
        return _run(words)
    except SystemExit as ended:
        return int(ended.code or 0)
    except KeyboardInterrupt:
        return _tell(words, "interrupted", "Interrupted", INTERRUPTED)
    except (UsageError, ParameterError) as error:
        return _tell(words, str(error), type(error).__name__, USAGE)
    except TmsolveError as error:
        return _tell(words, str(error), type(error).__name__, FAILED)
    except BrokenPipeError:
        raise
    except OSError as error:
        return _tell(words, f"{error.strerror or error}: {error.filename}", type(error).__name__, FAILED)
    except MemoryError:
        return _tell(words, "not enough memory; ask for fewer points or a smaller model", "MemoryError", FAILED)
    except Exception as error:
        import traceback

        traceback.print_exc()
        text = f"unexpected {type(error).__name__}: {error}; this is a fault of tmsolve, please report it"
        return _tell(words, text, type(error).__name__, FAILED)


def _run(words: list[str]) -> int:
    if words and words[0] in COMMANDS:
        from importlib import import_module

        from .parser import Parser

        command = import_module(f".{words[0]}", __package__)
        parser = Parser(words[0], command.OPERANDS, command.DESCRIPTION, command.EXAMPLES)
        command.configure(parser)
        return command.run(parser.read(words[1:]))
    if "-h" in words or "--help" in words:
        sys.stdout.write(overview())
        return 0
    if "--version" in words:
        from .._version import __version__

        print(f"tmsolve {__version__}")
        return 0
    raise UsageError(_no_command(words))


def _no_command(words: list[str]) -> str:
    known = f"the commands are {listing(COMMANDS)}"
    if not words:
        return f"no command given; {known}"
    if words[0].startswith("-"):
        return f"the command comes first, got {words[0]!r}; {known}"
    return f"no command {words[0]!r}; {known}.{did_you_mean(words[0], COMMANDS)}"


def _tell(words: list[str], message: str, kind: str, code: int) -> int:
    from .phrases import for_command_line

    message = for_command_line(message)
    command = words[0] if words and words[0] in COMMANDS else ""
    program = f"tmsolve {command}".rstrip()
    if "--json" in words:
        from .jsontext import json_text

        print(json_text({"error": {"kind": kind, "message": message}, "exit_code": code}))
        return code
    hint = f"\nTry: {program} --help" if code == USAGE else ""
    sys.stdout.flush()
    print(
        f"{program}: {message}{hint}" if code == INTERRUPTED else f"{program}: error: {message}{hint}",
        file=sys.stderr,
    )
    return code


def _tolerate_narrow_encodings() -> None:
    """Print '?' for a Greek letter where the terminal's encoding has none, instead of failing."""
    for stream in (sys.stdout, sys.stderr):
        reconfigure = getattr(stream, "reconfigure", None)
        if reconfigure is not None:
            reconfigure(errors="replace")
