"""What ``tmsolve derive`` works on: a chain, what was asked about it, and its closed form when one is needed."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

from ..errors import NotApplicable
from .outcome import UsageError

if TYPE_CHECKING:
    from ..declare import Chain
    from ..symbolic.forms import ClosedForm

__all__ = ["Derivation"]


@dataclass(frozen=True, eq=False)
class Derivation:
    """A chain and the options of the command.

    Attributes
    ----------
    chain : Chain
        With the parameters given fixed.
    seconds : float
        Time limit of every step.
    cells : int or None
        ``--cells``.
    opened : bool
        ``--open``.
    order : int
        ``--order``.
    about : str
        ``--about``: "high" or "low".
    """

    chain: Chain
    seconds: float
    cells: int | None
    opened: bool
    order: int
    about: str

    @cached_property
    def form(self) -> ClosedForm:
        """The closed form, derived at the first need of it."""
        from ..symbolic.forms import closed_form

        return closed_form(self.chain, time_limit=self.seconds)

    @property
    def counted(self) -> list[str]:
        """Names of symbolic numbers of colours."""
        from ..tabulate.colours import numbers_of_colours

        return list(numbers_of_colours(self.chain))

    @property
    def boundary(self) -> str:
        """The boundary in the words of the library."""
        return "open" if self.opened else "ring"

    def length(self, what: str) -> int:
        """Return ``--cells``, or say that it is needed."""
        if self.cells is None:
            raise UsageError(f"{what} needs a number of cells: add --cells N")
        return self.cells

    def partition_function(self) -> Any:
        """Return Z_N of a ring or of an open chain."""
        if not self.opened:
            return self.form.partition_function(self.cells)
        return self.form.open_partition_function(self.cells)

    def eigenvalues(self) -> Any:
        """Return all eigenvalues, or say why there is no list of them."""
        if not self.form.is_closed:
            raise NotApplicable(f"not every eigenvalue is known: {self.form.why}; ask for --quantity polynomial")
        return self.form.eigenvalues

    def series(self, name: str) -> Any:
        """Expand a quantity."""
        from ..symbolic.expansion.series import series

        return series(self.chain, self.order, self.about, name, time_limit=self.seconds)

    def limits(self) -> Any:
        """Return limits and leading corrections at both ends of the temperatures."""
        from ..symbolic.expansion.limits import limits

        return limits(self.chain, time_limit=self.seconds)

    def counts(self, names: tuple[str, ...]) -> Any:
        """Count configurations by energy or observables."""
        from ..symbolic.counting.counts import counts

        return counts(self.chain, self.length("counts"), names or ("energy",), self.boundary, time_limit=self.seconds)

    def zeros(self, variable: str) -> Any:
        """Find the zeros of Z_N in the complex plane."""
        from ..symbolic.counting.zeros import zeros

        return zeros(self.chain, self.length("zeros"), variable, self.boundary, time_limit=self.seconds)

    def limiting_curve(self, variable: str) -> Any:
        """Return the curve on which zeros of long chains lie, or nothing where it cannot be traced."""
        from ..errors import TmsolveError
        from ..symbolic.counting.limiting import limiting_curve

        try:
            return limiting_curve(self.chain, variable, time_limit=self.seconds)
        except TmsolveError:
            return None

    def generating_function(self) -> Any:
        """Return the sum of Z_N xᴺ as a rational function of x."""
        from ..symbolic.counting.generating import generating_function

        return generating_function(self.form, "x", self.boundary)

    def correlation(self, first: str, second: str | None = None) -> Any:
        """Return the whole correlation function with its distance as a symbol."""
        if self.opened:
            raise NotApplicable("correlation is that of the infinite chain; leave --open out")
        return self.form.correlation(first, second)
