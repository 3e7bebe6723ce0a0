"""What a table of numbers was made of: versions, chain, parameters, conventions."""

from __future__ import annotations

import os
import platform
from collections.abc import Iterable
from datetime import UTC, datetime
from fractions import Fraction
from typing import Any

import numpy as np

from .._version import __version__
from ..declare import Chain

__all__ = ["CONVENTIONS", "exact_text", "provenance"]

CONVENTIONS = (
    "k_B = 1; energies and T in the energy unit of the chain; energies as declared, each bond once; "
    "quantities per unit cell; f = -T ln(lambda_1); u = d(f/T)/d(1/T) at fixed parameters; c = du/dT; "
    "susceptibility(a,b) = d<a>/dphi for an added energy -phi*b; lengths in cells, "
    "wave numbers in [0, pi] per cell"
)


def exact_text(value: Any) -> str:
    """Return a parameter value as text that loses nothing.

    Examples
    --------
    >>> exact_text(Fraction(1, 10)), exact_text(Fraction(1, 3)), exact_text(float("inf"))
    ('0.1', '1/3', 'inf')
    """
    if isinstance(value, Fraction):
        if value.denominator == 1:
            return str(value.numerator)
        return repr(float(value)) if Fraction(repr(float(value))) == value else str(value)
    return repr(float(value))


def provenance(chain: Chain, scanned: Iterable[str] = ()) -> dict[str, Any]:
    """Return what is needed to know later how results were obtained, as plain JSON values.

    Parameters
    ----------
    chain : Chain
    scanned : iterable of str
        Parameters whose value varies over the results.

    Notes
    -----
    The time is left out where the environment variable ``SOURCE_DATE_EPOCH`` is set, so that
    files can be reproduced byte by byte.
    """
    varied = set(scanned)
    values = {name: value for name, value in {**chain.defaults, **chain.fixed}.items() if name not in varied}
    record: dict[str, Any] = {
        "software": {"tmsolve": __version__, "numpy": np.__version__, "python": platform.python_version()},
        "chain": chain.name,
        "states": {kind: list(states.labels) for kind, states in chain.cell.items()},
        "terms": [f"{term.role}: {term.label}" for term in chain.terms],
        "observables": {name: [term.label for term in terms] for name, terms in chain.observables.items()},
        "parameters": {name: exact_text(value) for name, value in values.items()},
        "conventions": CONVENTIONS,
    }
    if "SOURCE_DATE_EPOCH" not in os.environ:
        record["time"] = datetime.now(UTC).isoformat(timespec="seconds")
    return record
