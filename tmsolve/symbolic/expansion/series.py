"""The verb `series`: exact expansions at high and at low temperature, with or without a closed form."""

from __future__ import annotations

from typing import Any

from ...declare.chain import Chain
from ...errors import DeclarationError, ParameterError, TooLargeError, did_you_mean
from ..arguments import positive_seconds
from ..deadline import TimeUp, limited
from .functions import FunctionField
from .high import high_series
from .low import low_series
from .numbers import NumberField
from .quantities import Quantity, parse_quantity
from .result import Series
from .terms import LogSeries, leading_first

__all__ = ["series"]


def series(chain: Chain, order: int, about: str = "high", of: str = "free_energy", *, time_limit: float = 30) -> Series:
    """Expand a quantity of the infinite chain at high or at low temperature, with exact coefficients.

    At high temperature the expansion is in powers of β = 1/T, and the coefficients are
    polynomials in the free parameters, and rational functions of weights and of a symbolic
    number of colours; chains with forbidden configurations start from the
    growth factor of the allowed ones, and the coefficients lie in its number field. At low
    temperature it is in Boltzmann factors exp(−β E) of excitations, fractional powers included
    where ground states tie; the coefficients lie in the field of the growth factor of the
    ground states.

    Parameters
    ----------
    chain : Chain
        For low temperature with all parameters fixed at exact numbers by ``chain.fix``.
    order : int
        At high temperature the highest power of β. At low temperature all terms with
        E ≤ order · Δ are given, Δ being the least excitation energy in ln λ.
    about : {'high', 'low'}
        Temperature to expand about: infinite or zero.
    of : str
        ``free_energy``, ``internal_energy``, ``entropy``, ``specific_heat``, ``mean(a)``,
        ``susceptibility(a)``, ``susceptibility(a,b)``, or ``log_eigenvalue`` for ln λ = −β f.
    time_limit : float
        Seconds.

    Returns
    -------
    Series
        ``.terms``, ``.coefficients``, ``.expression``, ``.evaluate(T=…)``.

    Raises
    ------
    ParameterError
        Unknown quantity, observable or temperature, or an order that is no whole number ≥ 0.
    NotApplicable
        There is no such series: parameters without values at low temperature, energies
        without a common measure, classes of states that tie.
    TooLargeError
        Not finished within the time limit.

    Notes
    -----
    Where the leading root is simple, the eigenvector is expanded with it, which needs no
    characteristic polynomial; where ground states tie, the Newton polygon of the characteristic
    polynomial tells how they split (Newton–Puiseux).

    Examples
    --------
    >>> from tmsolve.declare import bond, ising, site
    >>> chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t), site(lambda s, h: -h*s)], {"m": lambda s: s})
    >>> print(series(chain, 3, of="mean(m)"))
    mean(m) of chain at high temperature, beta = 1/T
      <m> = beta*h + 2*beta**2*J*h + beta**3*(2*J**2*h - h**3/3) + O(beta**4)
    >>> print(series(chain.fix(J=-1, h=2), 1, about="low", of="log_eigenvalue"))
    log_eigenvalue of chain at low temperature, beta = 1/T
      ln(lambda) = beta + log(1/2 + sqrt(5)/2) + (-1/2 + 3*sqrt(5)/10)*exp(-4*beta) + o(exp(-4*beta))
    """
    if not isinstance(chain, Chain):
        raise DeclarationError(f"series takes a chain, got {chain!r}; parameters are fixed by chain.fix(…)")
    if isinstance(order, bool) or not isinstance(order, int) or order < 0:
        raise ParameterError(f"the order of a series is a whole number, 0 or larger; got {order!r}")
    if about not in ("high", "low"):
        hint = did_you_mean(str(about), ["high", "low"])
        raise ParameterError(f"about= is 'high' or 'low', the temperature to expand about; got {about!r}.{hint}")
    quantity = parse_quantity(of, chain)
    limit = positive_seconds(time_limit)
    try:
        return limited(limit, _expand, chain, order, about, quantity)
    except TimeUp:
        raise TooLargeError(
            f"the series of {quantity.name} to order {order} was not finished within the time limit of {limit:g} s; "
            "ask for a lower order, fix parameters with chain.fix(…), or give a longer time_limit"
        ) from None


def _expand(chain: Chain, order: int, about: str, quantity: Quantity) -> Series:
    if about == "high":
        log = high_series(chain, quantity.observables, max(0, order + quantity.lift))
    else:
        log = low_series(chain, quantity.observables, order)
    terms = quantity.terms(log)
    if about == "high":
        terms = [term for term in terms if term.power <= order]
    return Series(
        chain=chain,
        of=quantity.name,
        about=about,
        order=order,
        terms=leading_first(terms, about),
        growth=log.growth_expression,
        polynomial=_minimal(log),
        ground=None if about == "high" else log.ground,
        gap=log.gap,
        step=log.step,
        exact=log.exact,
        symbol=quantity.symbol,
        latex_symbol=quantity.latex,
    )


def _minimal(log: LogSeries) -> Any:
    """Return the minimal polynomial of the growth factor over the integers."""
    import sympy as sp

    x = sp.Symbol("x")
    field: NumberField = log.field
    if isinstance(field, FunctionField):
        return sp.Poly(x - log.growth_expression, x)
    rest = field.coordinates(log.growth)
    if not any(rest[1:]):
        return sp.Poly(rest[0].denominator * x - rest[0].numerator, x)
    if rest == [0, 1]:
        return sp.Poly(field.polynomial.as_expr().subs(field.polynomial.gen, x), x, domain="QQ").clear_denoms(
            convert=True
        )[1]
    return sp.Poly(sp.minimal_polynomial(log.growth_expression, x), x)
