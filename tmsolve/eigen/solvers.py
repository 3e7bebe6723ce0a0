"""Solver choices: small objects that say how a transfer matrix is treated."""

from __future__ import annotations

from dataclasses import dataclass

from ..errors import TooLargeError

__all__ = ["Auto", "Dense", "Solver"]


@dataclass(frozen=True)
class Dense:
    """Form the matrix and treat it as a whole.

    Attributes
    ----------
    max_size : int
        Largest number of joint states of the cut.
    bits : int
        Longest numbers, in bits, that points of low temperature or near ties may climb to.

    Examples
    --------
    >>> Dense(max_size=2).check(3)
    Traceback (most recent call last):
    ...
    tmsolve.errors.TooLargeError: Dense is limited to 2 states; this chain has 3. Use Dense(max_size=3), \
or shorten the longest bond or the cell
    """

    max_size: int = 4096
    bits: int = 4096

    def check(self, size: int) -> None:
        """Refuse a matrix that is too large."""
        if size > self.max_size:
            raise TooLargeError(
                f"Dense is limited to {self.max_size} states; this chain has {size}. "
                f"Use Dense(max_size={size}), or shorten the longest bond or the cell",
                limit=self.max_size,
            )


@dataclass(frozen=True)
class Auto:
    """Choose the solver by the size of the matrix; `select` shows the choice.

    Examples
    --------
    >>> Auto().select(9)
    Dense(max_size=4096, bits=4096)
    """

    def select(self, size: int) -> Dense:
        """Return the solver for a cut with so many joint states."""
        return Dense()


Solver = Dense | Auto
