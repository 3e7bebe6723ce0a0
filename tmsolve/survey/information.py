"""What a configuration of the chain tells about the parameters: Fisher information per cell."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import numpy as np

from ..assemble.matrix import handle
from ..declare import Chain
from ..errors import NotApplicable, ParameterError, listing, unknown_parameter
from ..observe.series import Series
from ..observe.solution import Solution
from .bound import require_solution

__all__ = ["FisherInformation", "fisher_information"]

#: Eigenvalues of the normalised matrix below this are rounding.
_SINGULAR = 1e-12


@dataclass(frozen=True, eq=False)
class FisherInformation:
    """Fisher information per cell, made by `fisher_information`.

    Attributes
    ----------
    names : tuple of str
        The parameters, in the order of the matrix.
    matrix : ndarray, shape (*batch, names, names)
        Symmetric, positive semidefinite.
    """

    names: tuple[str, ...]
    matrix: np.ndarray

    def standard_errors(self, cells: int) -> np.ndarray:
        """Return the least standard errors that an unbiased estimate from so many cells can have.

        The square roots of the diagonal of the inverse, divided by √cells: the bound of
        Cramér and Rao when all these parameters are estimated together.

        Parameters
        ----------
        cells : int
            Length of the observed configuration.

        Returns
        -------
        ndarray, shape (*batch, names)

        Raises
        ------
        ParameterError
            No whole number of cells.
        NotApplicable
            Some combination of the parameters leaves no trace in the configurations.

        Examples
        --------
        >>> from tmsolve import models, solve
        >>> r = solve(models.load("ising").chain.at(T=1, J=1, h=0))
        >>> fisher_information(r, ["J"]).standard_errors(10000).round(9).tolist()     # cosh 1 / 100
        [0.015430806]
        """
        if isinstance(cells, bool) or not isinstance(cells, (int, np.integer)) or cells < 1:
            raise ParameterError(f"cells is a whole number >= 1, got {cells!r}")
        matrix = self.matrix.astype(np.float64)
        size = np.sqrt(np.einsum("...ii->...i", matrix))
        self._refuse_silent(size)
        normal = matrix / (size[..., :, None] * size[..., None, :])
        levels, vectors = np.linalg.eigh(normal)
        if (levels[..., 0] < _SINGULAR).any():
            worst = int(levels[..., 0].argmin())
            weakest = vectors[..., 0].reshape(-1, len(self.names))[worst]
            mixed = [name for name, part in zip(self.names, weakest, strict=True) if abs(part) > 0.1]
            raise NotApplicable(
                f"a combination of {listing(mixed)} leaves no trace in the configurations, so they cannot be "
                "estimated together; leave one of them out"
            )
        inverse = np.einsum("...ik,...k->...i", vectors**2, 1 / levels)
        return np.sqrt(inverse / int(cells)) / size

    def _refuse_silent(self, size: np.ndarray) -> None:
        silent = [name for i, name in enumerate(self.names) if not (size[..., i] > 0).all()]
        if silent:
            raise NotApplicable(
                f"the configurations do not depend on {listing(silent)}, which cannot be estimated; leave it out"
            )


def fisher_information(solution: Solution, names: Sequence[str]) -> FisherInformation:
    """Return the Fisher information per cell of one long configuration about parameters and T.

    F_ij = lim (1/N) cov(∂_i ln P, ∂_j ln P), the covariance of the scores. With the
    logarithm of the weight B = −βE + ω this is the joint cumulant per cell of ∂_i B and
    ∂_j B, where ∂_θ B = −βE_θ + ω_θ and ∂_T B = β²E − βE_T + ω_T. For energies that are
    linear in the parameters F_ij = β² K(E_i, E_j) = −β ∂²f/∂θ_i∂θ_j; for other energies the
    second derivative of f contains ⟨E_ij⟩ too, and the covariance is what is returned. It
    is positive semidefinite always.

    Parameters
    ----------
    solution : Solution
    names : sequence of str
        Parameters of the chain, ``"T"`` among them if wanted.

    Returns
    -------
    FisherInformation

    Raises
    ------
    ParameterError
        Unknown, repeated or no names.

    Notes
    -----
    F_TT is c/T² where no parameter depends on T. With every energy proportional to one of
    the parameters, T and all of them together are not independent: the matrix is singular.
    The definition: common practice, no source.

    Examples
    --------
    >>> from tmsolve import models, solve
    >>> r = solve(models.load("ising").chain.at(T=1, J=1, h=0))
    >>> fisher_information(r, ["J", "h"]).matrix.round(9)           # 1/cosh² 1, e²
    array([[0.41997434, 0.        ],
           [0.        , 7.3890561 ]])
    """
    require_solution("fisher_information", solution)
    chain = solution.point.chain
    wanted = _names(chain, names)
    scores = [_score(chain, name) for name in wanted]
    kind = np.float64 if solution.laws.digits is None else object
    matrix = np.zeros((solution.point.size, len(wanted), len(wanted)), dtype=kind)
    for i, first in enumerate(scores):
        for j, second in enumerate(scores[: i + 1]):
            matrix[:, i, j] = matrix[:, j, i] = solution.laws.evaluate(_product(chain, first, second))
    return FisherInformation(wanted, matrix.reshape((*solution.shape, len(wanted), len(wanted))))


def _names(chain: Chain, names: Any) -> tuple[str, ...]:
    if isinstance(names, str) or not isinstance(names, Sequence) or not names:
        raise ParameterError(f'names= takes a list of parameters such as ["J", "h", "T"], got {names!r}')
    for i, name in enumerate(names):
        if name not in (*chain.parameters, "T"):
            raise unknown_parameter(name, chain.parameters)
        if name in names[:i]:
            raise ParameterError(f"parameter {name!r} is named twice")
    return tuple(names)


def _score(chain: Chain, name: str) -> dict[tuple[int, str], int]:
    """Return ∂B as (power of β, block) to coefficient."""
    parts: dict[tuple[int, str], int] = {}
    if name == "T":
        parts[2, handle("energy")] = 1
    roles = {term.role for term in chain.terms if name in term.parameters}
    if "energy" in roles:
        parts[1, handle("energy", (name,))] = -1
    if "weight" in roles:
        parts[0, handle("weight", (name,))] = 1
    return parts


def _product(chain: Chain, first: dict[tuple[int, str], int], second: dict[tuple[int, str], int]) -> Series:
    terms: dict[tuple[int, tuple[str, ...]], Fraction] = {}
    for (a, left), c in first.items():
        for (b, right), d in second.items():
            key = (a + b, tuple(sorted((left, right))))
            terms[key] = terms.get(key, Fraction(0)) + c * d
    return Series(chain, terms)
