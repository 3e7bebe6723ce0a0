"""Run a model file as a module; whatever goes wrong is told with the user's own line."""

from __future__ import annotations

import hashlib
import sys
import traceback
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import ModuleType

from ..errors import DeclarationError


def execute(path: Path) -> ModuleType:
    """Run the file afresh and return its module.

    The text is compiled from the file each time, past the bytecode cache: it would miss an edit made within
    the resolution of its time stamps. The module is registered under a private name because dataclasses look
    their module up by name.

    Raises
    ------
    DeclarationError
        The file cannot be read or does not run.
    """
    source = _read(path)
    name = "_tmsolve_model_" + hashlib.sha256(str(path).encode()).hexdigest()[:16]
    module = ModuleType(name)
    module.__file__ = str(path)
    former = sys.modules.get(name)
    sys.modules[name] = module
    try:
        with users_line(path):
            exec(compile(source, str(path), "exec", dont_inherit=True), module.__dict__)
    except BaseException:
        if former is None:
            del sys.modules[name]
        else:
            sys.modules[name] = former
        raise
    return module


def _read(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except FileNotFoundError:
        raise DeclarationError(f"there is no file {path}") from None
    except IsADirectoryError:
        raise DeclarationError(f"{path} is a folder; a model is one Python file") from None
    except OSError as error:
        raise DeclarationError(f"cannot read {path}: {error.strerror}") from error


@contextmanager
def users_line(path: Path) -> Iterator[None]:
    """Turn any exception into a DeclarationError that shows the line of the model file it came from."""
    try:
        yield
    except (Exception, SystemExit) as error:
        number, text = _place(error, path)
        where = f"{path}, line {number}: {text}" if number else f"{path}"
        raise DeclarationError(f"{where}\n{_message(error)}{_sibling_hint(error, path)}") from error


def _place(error: BaseException, path: Path) -> tuple[int, str]:
    """Line number and text of the innermost line of the model file that took part, or (0, "")."""
    if isinstance(error, SyntaxError) and error.filename == str(path):
        return error.lineno or 0, (error.text or "").strip()
    frames = [frame for frame in traceback.extract_tb(error.__traceback__) if frame.filename == str(path)]
    if not frames:
        return 0, ""
    # Read anew: the traceback's own copy of the text may be of an earlier state of the file.
    lines = path.read_text(encoding="utf-8", errors="replace").splitlines()
    number = frames[-1].lineno or 0
    return number, lines[number - 1].strip() if 0 < number <= len(lines) else ""


def _message(error: BaseException) -> str:
    if isinstance(error, DeclarationError):
        return str(error)
    text = error.msg if isinstance(error, SyntaxError) else str(error)
    return f"{type(error).__name__}: {text or 'no further message'}"


def _sibling_hint(error: BaseException, path: Path) -> str:
    if isinstance(error, ModuleNotFoundError) and error.name and (path.parent / f"{error.name}.py").exists():
        return f"\n{error.name}.py lies beside the model, but a model is one file: move what it needs into it"
    return ""
