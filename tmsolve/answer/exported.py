"""The verb `numpy_function`: a closed form as NumPy code that was compared with the solver."""

from __future__ import annotations

from typing import Any

from ..symbolic.closed import ClosedForm
from ..symbolic.export.numpy_function import numpy_function as written
from .solve import solve

__all__ = ["numpy_function"]


def numpy_function(form: ClosedForm, quantity: str) -> Any:
    """Return a quantity of a closed form as a NumPy function of T and the parameters.

    It is what `tmsolve.symbolic.export.numpy_function` writes, compared with `solve` as well at
    random points down to T = 0.01 (in units of the couplings) before it is returned.

    Parameters
    ----------
    form : ClosedForm
        Made by `closed_form`.
    quantity : str
        free_energy (f), internal_energy (u), entropy (s), specific_heat (c), mean(m),
        susceptibility(m), susceptibility(m,q) or correlation_length (xi).

    Returns
    -------
    function
        Takes T (unless it is fixed) and the free parameters in their order, by position or
        name; ``function.source`` is its text, which needs NumPy only.

    Raises
    ------
    ParameterError
        An unknown quantity or observable.
    NotApplicable
        There is no formula, or one that NumPy cannot compute.
    SolveError
        The function would not have all its digits at some temperature.

    Examples
    --------
    >>> from tmsolve import Chain, bond, closed_form, ising
    >>> form = closed_form(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
    >>> c = numpy_function(form, "specific_heat")
    >>> c(T=[1.0, 0.01], J=1.0)
    array([4.19974342e-01, 5.53558611e-83])
    """
    return written(form, quantity, solver=solve)
