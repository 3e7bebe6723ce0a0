"""Recursion relations of decimation as formulas, where the family of a chain closes."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import cached_property
from typing import Any, TypeVar

from ...declare.chain import Chain
from ...declare.inexact import require_discrete
from ...declare.values import parse_value
from ...errors import NotApplicable, ParameterError, TmsolveError, TooLargeError, did_you_mean, listing
from ...tabulate.symbolic import parameter_symbols
from ..arguments import positive_seconds
from ..closed import ClosedForm
from ..deadline import TimeUp, limited
from ..forms import closed_form
from ..plain import latex_text, plain_text
from ..readable import Writer
from .decimate import check_cells
from .recursion_closure import Closure, Image, close_family
from .recursion_tables import WeightTable, weight_table

__all__ = ["Recursion", "recursion"]

Result = TypeVar("Result")

#: Longer steps have powers with too many terms to be read.
_LONGEST = 12


@dataclass(frozen=True, eq=False, repr=False)
class Recursion:
    """How the parameters of a chain change when b − 1 of b cells are summed out.

    Made by `recursion`. Primed symbols are the renormalised parameters, at the same
    temperature; ``beta`` is 1/T.

    Attributes
    ----------
    chain : Chain
        Of which family.
    b : int
        Old cells per new cell.
    time_limit : float
        Seconds that each later question may take.
    held : tuple of sympy expressions
        Combinations of parameters that a ring does not depend on but by a constant, or that act like
        others; they keep their values.
    """

    chain: Chain
    b: int
    time_limit: float
    table: WeightTable
    closure: Closure

    @cached_property
    def primed(self) -> dict[Any, Any]:
        """Symbols of the free parameters and the renormalised ones."""
        import sympy as sp

        symbols = [s for name, s in parameter_symbols(self.chain).items() if name != "T" and s.is_Symbol]
        return {s: sp.Symbol(f"{s.name}'", real=True) for s in symbols}

    @property
    def held(self) -> tuple[Any, ...]:
        """Combinations of parameters that keep their values."""
        return tuple(self.table.alphabet.classes[k] for k in self.closure.held)

    @cached_property
    def equations(self) -> tuple[Any, ...]:
        """The recursion relations, one sympy equation per coupling."""
        return _in_time(self.time_limit, "the formulas", self._equations)

    def _equations(self) -> tuple[Any, ...]:
        import sympy as sp

        return tuple(
            sp.Eq(*self._solved(self.table.alphabet.classes[k].xreplace(self.primed), self._written(image)))
            for k, image in self.closure.images.items()
        )

    @cached_property
    def constant(self) -> Any:
        """−βC of the free energy per new cell: b f(p) = f(p′) + C."""
        return _in_time(self.time_limit, "the formulas", lambda: self._written(self.closure.constant))

    @cached_property
    def scaling(self) -> tuple[Any, ...]:
        """The same in variables that do not mix: ratios of eigenvalues, t′ = tᵇ.

        As many as there are different eigenvalues besides the largest; what else there is to a
        chain, the vectors of Wᵇ, does not change at all. Empty where the eigenvalues have no closed form.
        """
        import sympy as sp

        try:
            form = closed_form(self.chain, time_limit=self.time_limit)
        except TmsolveError:
            return ()
        if not form.is_closed:
            return ()
        ratios = [ratio for ratio in _ratios(form) if ratio != 0]
        return tuple(sp.Eq(ratio.xreplace(self.primed), ratio**self.b) for ratio in ratios)

    def at(self, **values: Any) -> dict[str, float]:
        """Evaluate the relations: the renormalised parameters at values of all parameters, T and q if free.

        Examples
        --------
        >>> from tmsolve import Chain, bond, ising
        >>> step = recursion(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
        >>> print(f"{step.at(J=0.5, T=1)['J']:.6f}")
        0.216890
        """
        point = self._numbers(values)
        found = {}
        for equation in self.equations:
            right = equation.rhs
            wanted = [s.name for s in right.free_symbols if s.name not in point]
            if wanted:
                names = ["T" if name == "beta" else name for name in sorted(wanted)]
                raise ParameterError(f"no value for {listing(names)}; give all of them, as in at(T=1, …)")
            number = right.xreplace({s: point[s.name] for s in right.free_symbols}).evalf(30)
            found[str(equation.lhs).replace("'", "")] = float(number)
        return found

    def _numbers(self, values: Mapping[str, Any]) -> dict[str, Any]:
        """Check names and values; T becomes beta."""
        import sympy as sp

        known = [*self.chain.free, *([] if "T" in self.chain.fixed else ["T"])]
        known += [self.table.number.name] if self.table.number is not None else []
        point: dict[str, Any] = {}
        for name, value in values.items():
            if name not in known:
                raise ParameterError(
                    f"no free parameter {name!r} in these relations; they take {listing(known)}."
                    f"{did_you_mean(name, known)}"
                )
            number = parse_value(name, value)
            if not isinstance(number, Fraction) or (name == "T" and number <= 0):
                wanted = "a temperature above 0" if name == "T" else "a single finite number"
                raise ParameterError(f"{name!r} must be {wanted}, got {value!r}")
            exact = sp.Rational(number.numerator, number.denominator)
            point["beta" if name == "T" else name] = 1 / exact if name == "T" else exact
        return point

    def _solved(self, left: Any, right: Any) -> tuple[Any, Any]:
        """Bring β, or the logarithm of a weight, to the other side."""
        import sympy as sp

        if isinstance(left, sp.log):
            return left.args[0], sp.exp(right)
        inverse = 1 / parameter_symbols(self.chain)["T"]
        rest = left / inverse
        return (left, right) if rest.has(inverse) else (rest, sp.Add(*(x / inverse for x in sp.Add.make_args(right))))

    def _written(self, image: Image) -> Any:
        import sympy as sp

        alphabet = self.table.alphabet
        writer = Writer(alphabet)
        shares = [*image.factors.values(), *image.primes.values()]
        share = Fraction(1, math.lcm(*(s.denominator for s in shares))) if shares else Fraction(1)
        product: Any = sp.Integer(1)
        for prime, exponent in image.primes.items():
            product *= sp.Integer(prime) ** int(exponent / share)
        for factor, exponent in image.factors.items():
            written, power = writer.write(dict(factor)), int(exponent / share)
            front, rest = written.as_coeff_Mul()
            product *= front**power * rest**power
        linear = sp.Add(*(_number(c) * alphabet.classes[k] for k, c in image.powers.items()))
        return _number(share) * sp.log(product) + linear if shares else linear

    def __str__(self) -> str:
        lines = [f"{self.chain.name}: every {self.b} cells become one, beta = 1/T"]
        lines += [f"  {plain_text(e.lhs)} = {plain_text(e.rhs)}" for e in self.equations]
        lines += [f"  {plain_text(e.lhs)} = {plain_text(e.rhs)}" for e in self.scaling]
        lines += [f"  kept: {plain_text(expr)}" for expr in self.held]
        return "\n".join(lines)

    def __repr__(self) -> str:
        return f"<Recursion of {self.chain.name!r} by {self.b}: {len(self.closure.images)} couplings>"

    def _repr_latex_(self) -> str:
        lines = [f"{latex_text(e.lhs)} &= {latex_text(e.rhs)}" for e in self.equations]
        return "$\\displaystyle \\begin{aligned} " + r" \\ ".join(lines) + " \\end{aligned}$"


def recursion(chain: Chain, b: int = 2, *, time_limit: float = 30) -> Recursion:
    """Derive the recursion relations of decimation for a family of chains that closes.

    The family closes when ln Wᵇ is of the chain's own form at all values of the free
    parameters; that is decided exactly. The number of colours may be a symbol.

    Parameters
    ----------
    chain : Chain
        Its free parameters are renormalised, those fixed by ``chain.fix`` must not change.
    b : int
        Old cells per new cell, 2 … 12.
    time_limit : float
        Seconds, for the derivation and for each later question to the result.

    Raises
    ------
    NotApplicable
        The family does not close; the message names the couplings that are missing.
    DeclarationError
        Energies that are not exact, or branch on a free parameter.

    Examples
    --------
    >>> from tmsolve import Chain, bond, ising
    >>> step = recursion(Chain(ising(), [bond(lambda s, t, J: -J*s*t)]))
    >>> step.equations[0], step.scaling[0]
    (Eq(J', log(cosh(2*J*beta))/(2*beta)), Eq(tanh(J'*beta), tanh(J*beta)**2))
    """
    cells = check_cells(b)
    if cells > _LONGEST:
        raise TooLargeError(
            f"b = {cells} gives powers too long to read; use b <= {_LONGEST}, or smaller steps one after the other",
            limit=_LONGEST,
        )
    allowed = positive_seconds(time_limit)
    require_discrete(chain.cell, "a recursion relation")
    table, closure = _in_time(allowed, "the recursion relations", lambda: _derive(chain, cells))
    if closure.missing:
        raise NotApplicable(
            f"summing out cells of {chain.name} creates couplings that it has no term for: {listing(closure.missing)}; "
            "declare them with parameters of their own, or use decimate(chain.at(…)) for numbers"
        )
    shared = _sharing(chain, table, closure)
    if shared:
        raise NotApplicable(
            f"summing out cells of {chain.name} changes {listing(shared)} independently, and the chain "
            "has too few parameters for that; give each a parameter of its own in the energy functions, or use "
            "decimate(chain.at(…)) for numbers"
        )
    return Recursion(chain, cells, allowed, table, closure)


def _sharing(chain: Chain, table: WeightTable, closure: Closure) -> list[str]:
    """Name the coordinates that change where they are not independent functions of the free parameters."""
    import sympy as sp

    inverse = 1 / parameter_symbols(chain)["T"]
    kept = [k for k, image in closure.images.items() if image == Image(powers={k: Fraction(1)})]
    classes = [table.alphabet.classes[k] for k in closure.coordinates if k not in kept]
    inside = [key.args[0] if isinstance(key, sp.log) else key / inverse for key in classes]
    symbols = sorted(set().union(*(x.free_symbols for x in inside)) - inverse.free_symbols, key=str)
    slopes = sp.Matrix([[sp.diff(x, symbol) for symbol in symbols] for x in inside])
    point = {symbol: sp.Rational(2 * k + 3, k + 2) for k, symbol in enumerate(symbols)}
    if slopes.subs(point).rank() == len(inside):
        return []
    return [f"the fixed energy {plain_text(x)}" if x.is_number else plain_text(x) for x in inside]


def _derive(chain: Chain, b: int) -> tuple[WeightTable, Closure]:
    table = weight_table(chain)
    return table, close_family(table, b)


def _in_time(seconds: float, what: str, compute: Callable[[], Result]) -> Result:
    try:
        return limited(seconds, compute)
    except TimeUp:
        raise TooLargeError(
            f"{what} of this chain were not finished within {seconds:g} s; fix parameters with chain.fix(…), take a "
            "smaller b, give a longer time_limit, or use decimate(chain.at(…)) for numbers"
        ) from None


def _number(c: Fraction) -> Any:
    import sympy as sp

    return sp.Rational(c.numerator, c.denominator)


def _ratios(form: ClosedForm) -> list[Any]:
    import sympy as sp

    (largest, _), *others = form.eigenvalues
    found = []
    for value, _ in others:
        ratio = value / largest
        for sine in ratio.atoms(sp.sinh):
            argument = sine.args[0]
            ratio = ratio.subs(sine / sp.cosh(argument), sp.tanh(argument))
        found.append(ratio)
    return list(dict.fromkeys(found))
