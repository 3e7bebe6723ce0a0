"""How many modes an observable shows, counted where they are easily told apart.

An amplitude is an analytic function of the temperature and of the parameters: it vanishes
everywhere or almost nowhere. exp(−E/T) of rational energies at a rational T > 0 is
transcendental, so where all energies are known exactly "almost nowhere" means nowhere. λ₁ is
simple all along, and the other modes pass into each other; so the number of modes that are
hidden, counted at a warm point, holds at every temperature.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from typing import Any, NamedTuple

import numpy as np

from ..assemble.matrix import Assembled
from ..assemble.window import ChainWindow
from ..operators.numbers import DOUBLE
from .certain import certain_modes

__all__ = ["Census", "aside", "census"]

#: Seconds that a count may take, roughly.
_PATIENCE = 4.0


class Census(NamedTuple):
    """Different eigenvalues other than λ₁ and 0, in the chain of classes.

    Attributes
    ----------
    shown : int
        How many an observable shows; with running parameters, at most.
    present : int
        How many there are.
    """

    shown: int
    present: int


def census(
    window: ChainWindow,
    states: np.ndarray,
    values: Mapping[str, Any],
    observable: str,
    classes: np.ndarray | None,
    running: tuple[str, ...] = (),
) -> Census | None:
    """Count the modes that an observable shows at a temperature where weights are of one size.

    Parameters
    ----------
    window : ChainWindow
    states : ndarray of int
    values : mapping
        Parameters and ``T`` of one point; T itself does not matter.
    observable : str
    classes : ndarray of int or None
        An equitable partition of the states that resolves the observable.
    running : tuple of str
        Parameters that have other values at other points: taken slightly aside, so that nothing
        is hidden here that is not hidden everywhere.

    Returns
    -------
    Census or None
        ``None`` where the chain is too large, or its energies depend on the temperature.
    """
    if window.chain.uses_temperature:
        return None
    warm = {name: value for name, value in aside(values, running).items() if name != "T"}
    energy = Assembled(window, {**warm, "T": Fraction(1)}, 1, DOUBLE).reduced[0]
    spread = float(energy.max() - energy.min())
    warm["T"] = Fraction(repr(spread)) if spread > 0 else Fraction(1)
    found = certain_modes(window, states, warm, observable, classes, _PATIENCE, everything=True, strict=True)
    return None if found is None else Census(sum(mode.shown for mode in found), len(found))


def aside(values: Mapping[str, Any], running: tuple[str, ...]) -> dict[str, Fraction]:
    """Return exact parameters, running ones moved by a few per cent: what holds there holds almost everywhere.

    Examples
    --------
    >>> moved = aside({"J": 1.0, "h": Fraction(1, 2)}, ("J",))
    >>> moved["h"], 0.9 <= moved["J"] <= 1.1
    (Fraction(1, 2), True)
    """
    drawn = np.random.default_rng(7)
    moved = {name: Fraction(int(drawn.integers(900, 1100)), 1000) for name in sorted(running)}
    return {name: _exact(value) * moved.get(name, 1) for name, value in values.items()}


def _exact(value: Any) -> Fraction:
    return value if isinstance(value, Fraction) else Fraction(repr(float(value)))
