"""A located crossover."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Event"]


@dataclass(frozen=True)
class Event:
    """A place along a line of parameters where the behaviour of a chain crosses over.

    Attributes
    ----------
    kind : str
        ``"maximum of specific_heat"``, ``"maximum of susceptibility(m)"``, ``"half-way of m"``,
        ``"disorder point"``, …
    along : str
        The parameter (or ``"T"``) that varies.
    location : float
        Its value at the event: a root, never a grid point.
    error : float
        Bound of the error of the location: rounding in the function whose root it is over the
        slope there, and the rounding of the location itself.
    height : float
        Maximum: the quantity there. Half-way point: the mean of the observable. Disorder
        point: the decay length, in cells, of the two modes that merge.
    width : float
        Maximum of Q: √(Q/|Q″|), the half width of a Lorentzian of the same curvature divided
        by √2. Half-way point: range of the observable over |slope|. Disorder point: distance
        over which (λ_a − λ_b)²/4 changes by λ_a λ_b, so that on the oscillating side the wave
        number (or π minus it) starts as √(distance/width).
    note : str
        What is worth knowing beyond the numbers.

    Examples
    --------
    >>> print(Event("maximum of specific_heat", "T", 0.8335565596, 1e-15, 0.4392288399, 0.4))
    maximum of specific_heat at T = 0.8335565596 ± 1e-15: height 0.43922884, width 0.4
    """

    kind: str
    along: str
    location: float
    error: float
    height: float
    width: float
    note: str = ""

    def __str__(self) -> str:
        note = f" ({self.note})" if self.note else ""
        return (
            f"{self.kind} at {self.along} = {self.location!r} ± {self.error:.1g}: "
            f"height {self.height:.8g}, width {self.width:.4g}{note}"
        )
