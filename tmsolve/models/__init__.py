"""Named chains that ship with tmsolve, and the loader for model files of your own.

A model is one plain Python file with ``CHAIN = Chain(...)`` or ``def chain(**options)`` that returns a chain,
and, if wanted, ``DEFAULTS`` (parameter values worth looking at) and ``FACTS`` (known results with sources).

>>> from tmsolve import models
>>> "potts" in models.names()
True
>>> models.load("potts", q=5).chain.parameters
('J', 'h')
"""

from ._load import LoadedModel, load
from ._names import folders, names

# Lets tmsolve.models.NAME be imported from a checkout, where the files lie in models/ beside the package.
__path__[:] = [str(folder) for folder in folders()]

__all__ = ["LoadedModel", "load", "names"]
