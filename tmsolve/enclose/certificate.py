"""What `certify` returns."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property

from ..declare import Point
from .enclosure import Enclosure
from .spectrum import EigenvalueBall

__all__ = ["Certificate"]


@dataclass(frozen=True)
class Certificate:
    """Rigorous bounds on the free energy per cell of one point, and on demand on the spectrum.

    Attributes
    ----------
    point : Point
        What it is about.
    free_energy : Enclosure
        f = −T ln λ₁, with exact ends.
    log_eigenvalue : Enclosure
        ln λ₁.
    requested : int
        Significant digits asked for.
    bits : int
        Length of the numbers that gave the bounds.
    inexact : tuple of str
        Labels of terms whose functions return rounded numbers. The bounds then belong to
        the chain with exactly those doubles as energies.
    size : int
        Joint states of the cut, the order of the transfer matrix.
    method : str
        Arithmetic of the intervals.
    """

    point: Point
    free_energy: Enclosure
    log_eigenvalue: Enclosure
    requested: int
    bits: int
    inexact: tuple[str, ...]
    size: int
    method: str
    _spectrum: Callable[[], tuple[EigenvalueBall, ...]] = field(repr=False, compare=False)

    @property
    def digits(self) -> int | float:
        """Significant digits of the free energy that are certain; inf where it is known exactly."""
        return self.free_energy.digits

    @property
    def certified(self) -> bool:
        """Whether as many digits are certain as were asked for."""
        return self.digits >= self.requested

    @property
    def exact_input(self) -> bool:
        """Whether the bounds are about exactly what was declared, with no rounded energy among it."""
        return not self.inexact

    @cached_property
    def spectrum(self) -> tuple[EigenvalueBall, ...]:
        """Balls around all eigenvalues of the transfer matrix, the largest first; computed when asked for.

        Raises
        ------
        MissingExtra
            python-flint is not installed (extra "certified").
        TooLargeError
            More than 64 joint states.
        """
        return self._spectrum()

    def contains(self, value: object) -> bool:
        """Whether a value of the free energy is compatible with the bounds."""
        return self.free_energy.contains(value)

    def __str__(self) -> str:
        text = self.free_energy.text(self.requested + 2)
        if not self.certified:
            known = "no digit" if not self.digits else f"{self.digits} digit{'s' * (self.digits != 1)}"
            text += f" (not certified to {self.requested} digits: {known} with {self.bits} bits)"
        if self.inexact:
            text += f" (inexact input: the doubles that {', '.join(self.inexact)} returned)"
        return text
