"""A series as a result: terms, formula, text, LaTeX and numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from fractions import Fraction
from functools import cached_property
from types import MappingProxyType
from typing import Any

from ...declare.chain import Chain
from ...declare.point import check_temperature
from ...declare.values import parse_value
from ...errors import NotApplicable, ParameterError, did_you_mean, listing, unknown_parameter
from ...tabulate.colours import numbers_of_colours
from ...tabulate.symbolic import beta, parameter_symbols
from ..plain import latex_text, plain_text
from .terms import SeriesTerm, by_beta, leading_first, scaled

__all__ = ["Series"]


@dataclass(frozen=True, eq=False, repr=False)
class Series:
    """An exact expansion of a quantity per cell, in powers of β = 1/T or in Boltzmann factors.

    Made by `series`. It is Σ c · βᵖ · exp(−β E) with exact coefficients c; energies are in the
    user's unit, k_B = 1.

    Attributes
    ----------
    chain : Chain
        What was expanded.
    of : str
        The quantity, such as ``"free_energy"``.
    about : {'high', 'low'}
        Temperature.
    order : int
        At high temperature the highest power of β; at low temperature all terms with
        E ≤ order · ``gap`` are there.
    terms : tuple of SeriesTerm
        ``.coefficient``, ``.power`` p, ``.energy`` E; leading ones first.
    growth : sympy expression
        Growth factor per cell of what is counted at zeroth order: of all configurations at
        high temperature, of ground states at low.
    polynomial : sympy.Poly
        Minimal polynomial of ``growth``, which is its largest real root; x − growth where that is
        a rational function of weights or of a number of colours.
    ground : sympy number or None
        Ground-state energy per cell; None at high temperature.
    gap : sympy number or None
        Least energy E in ln λ, the excitation energy; None at high temperature, and where
        every allowed configuration is a ground state.
    step : sympy number or None
        All E are whole multiples of it; None at high temperature.
    exact : bool
        Whether there are no further terms: nothing depends on T but through f = −T ln λ.

    Examples
    --------
    >>> from tmsolve.declare import bond, ising
    >>> from tmsolve.symbolic.expansion.series import series
    >>> ising_chain = Chain(ising(), [bond(lambda s, t, J: -J*s*t)])
    >>> print(series(ising_chain, 3).expression)
    J**4*beta**3/12 - J**2*beta/2 - log(2)/beta
    >>> print(series(ising_chain.fix(J=1), 2, about="low").expression)
    -1 - exp(-2*beta)/beta + exp(-4*beta)/(2*beta)
    """

    chain: Chain
    of: str
    about: str
    order: int
    terms: tuple[SeriesTerm, ...]
    growth: Any
    polynomial: Any
    ground: Any
    gap: Any
    step: Any
    exact: bool
    symbol: str = field(default="", repr=False)
    latex_symbol: str = field(default="", repr=False)

    @property
    def variable(self) -> Any:
        """What the powers are of: β at high temperature, exp(−β · step) at low temperature."""
        import sympy as sp

        return beta() if self.about == "high" else sp.exp(-beta() * self.step)

    @cached_property
    def coefficients(self) -> Mapping[Any, Any]:
        """Coefficients by the power of `variable`; at low temperature they may contain powers of β."""
        found: dict[Any, Any] = {}
        for c, power, energy in self.terms:
            key = power if self.about == "high" else int(energy / self.step)
            part = c if self.about == "high" else c * beta() ** power
            found[key] = found[key] + part if key in found else part
        return MappingProxyType(found)

    @cached_property
    def expression(self) -> Any:
        """The sum of all terms as a sympy expression."""
        import sympy as sp

        return sp.Add(*(self._written(term) for term in self.terms))

    def with_order(self, name: str = "x") -> Any:
        """Return the sum with sympy's O term behind it.

        At high temperature it is a series in ``beta``; at low temperature in a symbol of the
        given name, which stands for `variable`, and β in coefficients is a constant to it.
        """
        import sympy as sp

        symbol = beta() if self.about == "high" else sp.Symbol(name, positive=True)
        total = sp.Add(*(c * symbol**power for power, c in self.coefficients.items()))
        return total if self.exact else total + sp.O(symbol ** (self._last + 1), symbol)

    @property
    def _last(self) -> int:
        """The last power of `variable` that is known."""
        if self.about == "high":
            return self.order
        return 0 if self.gap is None else int(self.order * self.gap / self.step)

    @staticmethod
    def _written(term: SeriesTerm) -> Any:
        import sympy as sp

        return sp.Mul(term.coefficient, beta() ** term.power, sp.exp(-term.energy * beta()))

    def derivative(self, *names: str) -> Series:
        """Return the derivative by parameters and ``"T"``, term by term.

        A derivative by T raises the highest power of β that is known by one.

        Raises
        ------
        ParameterError
            A name that is not a free parameter.
        NotApplicable
            A derivative by a parameter at low temperature, where parameters are numbers.
        """
        result = self
        for name in names:
            result = result._differentiated(name)
        return result

    def _differentiated(self, name: str) -> Series:
        import sympy as sp

        of = f"derivative of {self.of} by {name}"
        if name == "T":
            terms = scaled(by_beta(self.terms), -1, 2)
            order = self.order + (self.about == "high")
        elif name not in self.chain.free:
            if name in self.chain.fixed:
                raise NotApplicable(
                    f"{name!r} is fixed in this chain, so that the series is not known as a function of it; expand the "
                    f"chain with {name} free at high temperature, or use series(…, of='mean(a)') for a source a"
                )
            raise unknown_parameter(name, self.chain.parameters)
        else:
            symbol = parameter_symbols(self.chain)[name]
            terms = [SeriesTerm(sp.diff(c, symbol), p, energy) for c, p, energy in self.terms]
            order = self.order
        symbols = f"d({self.symbol})/d{name}", rf"\partial_{{{name}}} {self.latex_symbol}"
        return replace(
            self, of=of, order=order, terms=leading_first(terms, self.about), symbol=symbols[0], latex_symbol=symbols[1]
        )

    def evaluate(self, **values: Any) -> Any:
        """Return the sum of the terms at T and the free parameters, in double precision.

        Parameters
        ----------
        **values
            ``T`` and every parameter or number of colours in the coefficients: numbers, decimal
            strings or arrays.

        Raises
        ------
        ParameterError
            A value is missing, unknown or not a number.
        """
        import sympy as sp

        symbols = {str(symbol): symbol for symbol in self.expression.free_symbols} | {"beta": beta()}
        known = ["T", *self.chain.free, *numbers_of_colours(self.chain)]
        needed = [name for name in known if name == "T" or name in symbols]
        for name in values:
            if name not in known:
                fixed = " It is fixed." if name in self.chain.fixed else did_you_mean(name, known)
                raise ParameterError(f"no free parameter {name!r}; this series depends on {listing(needed)}.{fixed}")
        missing = [name for name in needed if name not in values]
        if missing:
            raise ParameterError(f"no value for {listing(missing)}; this series depends on {listing(needed)}")
        numbers = {name: _number(parse_value(name, value)) for name, value in values.items()}
        _check_positive(numbers["T"])
        arguments = {symbol: 1 / numbers["T"] if name == "beta" else numbers[name] for name, symbol in symbols.items()}
        plain = self.expression.xreplace({root: root.evalf(20) for root in self._roots})
        return sp.lambdify(list(arguments), plain, modules="numpy")(*arguments.values()) + 0 * arguments[beta()]

    def __str__(self) -> str:
        import sympy as sp

        text = ""
        for term in self.terms:
            part = plain_text(self._named(self._written(term)))
            text += f" - {part[1:]}" if text and part.startswith("-") else f" + {part}" if text else part
        lines = [f"{self.of} of {self.chain.name} at {self.about} temperature, beta = 1/T", f"  {self.symbol} = "]
        lines[1] += f"{text or '0'}{self._remainder()}"
        for root, name in self._roots.items():
            lines.append(f"  {name} = {float(root):.12g}, root of {root.poly.as_expr(sp.Symbol('x'))}")
        return "\n".join(lines)

    def _remainder(self) -> str:
        if self.exact:
            return ""
        if self.about == "high":
            return f" + O({plain_text(beta() ** (self.order + 1))})"
        import sympy as sp

        return f" + o({plain_text(sp.exp(-beta() * self.order * self.gap))})"

    @cached_property
    def _roots(self) -> dict[Any, Any]:
        """Algebraic numbers without radicals, and their names in texts."""
        import sympy as sp

        roots = sorted(self.expression.atoms(sp.CRootOf), key=lambda root: (root.poly.degree(), str(root)))
        names = ["rho"] if len(roots) == 1 else [f"rho_{k}" for k in range(1, len(roots) + 1)]
        return dict(zip(roots, map(sp.Symbol, names), strict=True))

    def _named(self, expr: Any) -> Any:
        return expr.xreplace(self._roots)

    @property
    def latex(self) -> str:
        """The series as LaTeX, with its remainder."""
        import sympy as sp

        parts = [latex_text(self._named(self._written(term))) for term in self.terms]
        text = "".join(part if part.startswith("-") or not k else f"+{part}" for k, part in enumerate(parts)) or "0"
        if not self.exact:
            high = self.about == "high"
            size = beta() ** (self.order + 1) if high else sp.exp(-beta() * self.order * self.gap)
            text += f" + {'O' if high else 'o'}\\left({latex_text(size)}\\right)"
        return f"{self.latex_symbol} = {text}"

    def _repr_latex_(self) -> str:
        return f"$\\displaystyle {self.latex}$"

    def __repr__(self) -> str:
        return f"<Series of {self.of} of {self.chain.name!r} at {self.about} temperature: {len(self.terms)} terms>"


def _check_positive(temperature: Any) -> None:
    check_temperature(temperature)
    if not (temperature > 0 if isinstance(temperature, float) else temperature.all()):
        raise ParameterError("a series is evaluated at temperatures above 0, got T = 0; its limit is its first term")


def _number(value: Any) -> Any:
    return float(value) if isinstance(value, Fraction) else value
