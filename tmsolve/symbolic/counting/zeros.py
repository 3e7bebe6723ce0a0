"""The verb `zeros`: zeros of a partition function in a complex field or Boltzmann factor."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ...declare.chain import Chain
from ...errors import NotApplicable, ParameterError, TooLargeError
from ..arguments import positive_seconds
from ..deadline import TimeUp, limited
from ..pieces import check_boundary, check_cells, check_chain
from .certified import by_argument, certified_roots
from .counted import Counts
from .counts import levels_of
from .fugacity import Fugacity, check_variable, numeric_coefficients, polynomial_of
from .squarefree import MixedTerms, generators, square_free_parts
from .sums import make_plan
from .walk import make_walk

__all__ = ["Zeros", "zeros"]


@dataclass(frozen=True, eq=False, repr=False)
class Zeros:
    """Zeros of the partition function of N cells in a complex variable.

    Attributes
    ----------
    zeros : tuple of mpmath.mpc
        All different zeros, by argument from 0 to 2π and then by modulus. Zeros on the real
        axis have no imaginary part. z = 0 is not among them.
    multiplicities : tuple of int
        How often each is a zero.
    errors : tuple of mpmath.mpf
        Proved bounds of |z − exact zero|.
    variable : str
        What z is, such as "z = exp(-2*beta*h)".
    cells, boundary : int, str
        What chain it is.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising, site
    >>> from tmsolve.symbolic.counting.zeros import zeros
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)])
    >>> found = zeros(chain.fix(J=1, T=2), 6)
    >>> found.variable, bool(max(abs(abs(z) - 1) for z in found.zeros) < 1e-30)
    ('z = exp(-2*beta*h)', True)
    """

    zeros: tuple[Any, ...]
    multiplicities: tuple[int, ...]
    errors: tuple[Any, ...]
    fugacity: Fugacity
    cells: int
    boundary: str
    _terms: MixedTerms = field(repr=False)

    @property
    def variable(self) -> str:
        """What z is."""
        return self.fugacity.text

    @property
    def error(self) -> Any:
        """Largest of the error bounds."""
        return max(self.errors, default=0)

    @property
    def polynomial(self) -> Any:
        """The polynomial whose zeros they are: sympy Poly in z and y₀, y₁, …, with whole coefficients.

        Up to a power of z and a positive factor it is Z. The y are the numbers of `factors`.
        """
        import sympy as sp

        return sp.Poly.from_dict(dict(self._terms), *generators(1 + len(self.fugacity.rates)), domain=sp.ZZ)

    @property
    def factors(self) -> dict[Any, Any]:
        """Exact values of the Boltzmann factors y in `polynomial`."""
        return self.fugacity.factors

    @property
    def array(self) -> np.ndarray:
        """The zeros in doubles, each as often as its multiplicity; complex128."""
        repeated = [complex(z) for z, m in zip(self.zeros, self.multiplicities, strict=True) for _ in range(m)]
        return np.array(repeated, dtype=np.complex128)

    def __len__(self) -> int:
        return len(self.zeros)

    def __str__(self) -> str:
        import mpmath as mp

        lines = [f"{self.cells} cells ({self.boundary}), {self.variable}, errors at most {mp.nstr(self.error, 2)}"]
        for z, m in zip(self.zeros, self.multiplicities, strict=True):
            sign = "-" if z.imag < 0 else "+"
            times = "" if m == 1 else f"  ({m} times)"
            lines.append(f"  {mp.nstr(z.real, 15):>22} {sign} {mp.nstr(abs(z.imag), 15)} i{times}")
        return "\n".join(lines)

    def __repr__(self) -> str:
        return f"<Zeros of {self.cells} cells ({self.boundary}) in {self.variable}: {len(self.zeros)}>"


def zeros(
    chain: Chain, N: int, variable: str = "h", boundary: str = "ring", *, digits: int = 30, time_limit: float = 60
) -> Zeros:
    """Find all zeros of the partition function of N cells in the complex plane.

    Z is an exact polynomial in z, found by counting; multiplicities come from its square-free
    decomposition, and the zeros lie in discs that are proved to hold one each.

    Parameters
    ----------
    chain : Chain
        Everything but the variable is fixed: ``chain.fix(J=1, T="0.7")``. T is needed where
        other energies remain, that is, whenever Z has more than one Boltzmann factor.
    N : int
        Number of cells.
    variable : str
        A parameter p in which the energy is linear, such as a field or a coupling: then
        z = exp(−β g p) with the largest step g that makes Z a polynomial. Or ``"T"``:
        z = exp(−β g) with the step g of the energies.
    boundary : str
        ``"ring"`` or ``"open"``.
    digits : int
        Asked of every zero.
    time_limit : float
        Seconds.

    Raises
    ------
    ParameterError
        Parameters without a number, or a variable that the energy is not linear in.
    NotApplicable
        The energies have no common step, or no configuration is allowed.
    TooLargeError
        The polynomial would not fit, or the time is over.

    References
    ----------
    .. [1] C. N. Yang and T. D. Lee, Phys. Rev. 87, 404 (1952).
    .. [2] T. D. Lee and C. N. Yang, Phys. Rev. 87, 410 (1952).
    .. [3] M. E. Fisher, Lectures in Theoretical Physics 7C, 1 (1965): zeros in the temperature.

    Examples
    --------
    >>> from tmsolve import Chain, bond, colours, delta
    >>> potts = Chain(colours(3), [bond(lambda s, t, J: -J*delta(s, t))])
    >>> print(zeros(potts, 2, variable="J", boundary="open"))            # Z = 3 (e^βJ + 2)
    2 cells (open), z = exp(-beta*J), errors at most ...
                        -0.5 + 0.0 i
    """
    check_chain(chain, "zeros")
    ring = check_boundary(boundary)
    cells = check_cells(chain, N, ring)
    allowed = positive_seconds(time_limit)
    check_variable(chain, variable)
    if isinstance(digits, bool) or not isinstance(digits, int) or not 1 <= digits <= 1000:
        raise ParameterError(f"digits is a whole number from 1 to 1000, got {digits!r}")
    try:
        return limited(allowed, _zeros, chain, cells, variable, boundary, digits)
    except TimeUp:
        raise TooLargeError(
            f"the zeros of {cells} cells were not found within {allowed:g} s; ask for fewer cells or digits, or give "
            "a longer time_limit"
        ) from None


def _zeros(chain: Chain, cells: int, variable: str, boundary: str, digits: int) -> Zeros:
    plan = make_plan(chain, ("energy",))
    walk = make_walk(plan, cells, boundary == "ring")
    table = Counts.of(plan, walk, levels_of(walk), cells, boundary)
    if not table:
        raise NotApplicable("no configuration of this chain is allowed: Z = 0 for every z")
    fugacity, terms = polynomial_of(chain, variable, table)
    found: list[tuple[Any, int, Any]] = []
    for part, multiplicity in square_free_parts(terms):
        roots, radii = certified_roots(numeric_coefficients(part, fugacity.rates), digits)
        found += [(z, multiplicity, radius) for z, radius in zip(roots, radii, strict=True)]
    found.sort(key=lambda item: by_argument(item[0]))
    values, multiplicities, errors = (tuple(item[k] for item in found) for k in range(3))
    return Zeros(values, multiplicities, errors, fugacity, cells, boundary, terms)
