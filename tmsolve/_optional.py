"""Import a library that only an extra installs, or say which extra that is."""

from __future__ import annotations

import importlib
from types import ModuleType

from .errors import MissingExtra


def require(module: str, *, extra: str) -> ModuleType:
    """Import a module of an optional library, such as ``"matplotlib.pyplot"``.

    Parameters
    ----------
    module
        Dotted name of the module; it is the one returned, not its top-level package.
    extra
        The extra of tmsolve that brings the library.

    Raises
    ------
    MissingExtra
        The library is not installed, or is installed but broken; the message holds the command that mends it.

    Examples
    --------
    >>> require("json.decoder", extra="plot").__name__
    'json.decoder'
    """
    library = module.partition(".")[0]
    try:
        return importlib.import_module(module)
    except ImportError as error:
        command = f'python -m pip install "tmsolve[{extra}]"'
        if isinstance(error, ModuleNotFoundError) and error.name in (library, module):
            text = f"{module} is not installed; it comes with the extra '{extra}': {command}"
        else:
            text = f"{library} is installed but cannot be imported ({error}); reinstall it: {command}"
        raise MissingExtra(text) from error
