"""NumPy source for any formula of a closed form, with signs and logarithms instead of numbers.

Exponentials of β·energy exceed doubles at low temperature although their quotients do not. Every
part of a formula that contains them is computed as a sign and a logarithm.
"""

from __future__ import annotations

from typing import Any

from ...errors import NotApplicable
from ...tabulate.symbolic import beta
from .numpy_surds import Exponentials, as_exponentials, as_surd

__all__ = ["expression_lines", "python_text"]

#: Longer sums of fractions are not brought over one denominator.
_JOINED = 300
#: Functions whose values are of the size of their arguments.
_TAME = {"log", "acos", "cos", "sin", "atan", "tanh", "sign"}
_NAMES = {"acos": "numpy.arccos", "cos": "numpy.cos", "sin": "numpy.sin", "atan": "numpy.arctan", "tanh": "numpy.tanh"}


def python_text(expr: Any) -> str:
    """Return an expression as Python with ``numpy.`` in front of functions.

    Examples
    --------
    >>> import sympy as sp
    >>> python_text(sp.sqrt(sp.Symbol("J")) + sp.Rational(1, 3))
    'numpy.sqrt(J) + 1/3'
    """
    from sympy.printing.numpy import NumPyPrinter

    text: str = NumPyPrinter().doprint(expr)
    return text


def expression_lines(expr: Any) -> list[str]:
    """Return lines that compute ``result``.

    Raises
    ------
    NotApplicable
        A function that has no NumPy form.
    """
    writer = _Writer()
    text = writer.plain(expr)
    return [*writer.lines, f"result = {text}"]


class _Writer:
    """Writes one line per part that occurs, each once."""

    def __init__(self) -> None:
        self.lines: list[str] = []
        self._known: dict[Any, str] = {}

    def plain(self, expr: Any) -> str:
        """Return text for a number of ordinary size."""
        import sympy as sp

        if not expr.has(sp.Function):
            return f"({python_text(expr)})" if expr.args else python_text(expr)
        if isinstance(expr, sp.log):
            inside = expr.args[0]
            if isinstance(inside, sp.tanh):
                return f"_log_tanh({self.plain(inside.args[0])})"
            return f"{self.signed(inside)}[1]"
        name = expr.func.__name__
        if name == "acos":
            return f"numpy.arccos(numpy.clip({self.plain(expr.args[0])}, -1.0, 1.0))"
        if name in _NAMES and _tame(expr.args[0]):
            return f"{_NAMES[name]}({self.plain(expr.args[0])})"
        if not _tame(expr):
            return f"_value({self.signed(expr)})"
        if expr.is_Add or expr.is_Mul:
            return "(" + (" + " if expr.is_Add else " * ").join(map(self.plain, expr.args)) + ")"
        if expr.is_Pow:
            return f"({self.plain(expr.base)} ** {self.plain(expr.exp)})"
        raise NotApplicable(f"{expr.func.__name__} has no NumPy form here; use solve(chain.at(…)) for numbers")

    def signed(self, expr: Any) -> str:
        """Return the name of a variable that holds sign and logarithm."""
        if expr not in self._known:
            text = self._signed(expr)
            self._known[expr] = f"_{len(self._known)}"
            self.lines.append(f"{self._known[expr]} = {text}")
        return self._known[expr]

    def _signed(self, expr: Any) -> str:
        import sympy as sp

        if not expr.has(sp.Function):
            return f"_number({self.plain(expr)})"
        if expr.is_Add:
            text = self._sum(expr)
            if text is not None:
                return text
        many: dict[Any, str] = {sp.Add: "_plus", sp.Mul: "_times", sp.Max: "_largest"}
        if expr.func in many:
            return f"{many[expr.func]}({', '.join(map(self.signed, expr.args))})"
        if isinstance(expr, sp.exp):
            return f"(1.0, {self.plain(expr.args[0])})"
        if expr.is_Pow and expr.exp.is_Rational:
            return f"_power({self.signed(expr.base)}, {expr.exp.p}, {expr.exp.q})"
        if isinstance(expr, (sp.sinh, sp.cosh)):
            return f"_{expr.func.__name__}({self.plain(expr.args[0])})"
        if isinstance(expr, sp.tanh):
            inside = self.plain(expr.args[0])
            return f"(numpy.sign({inside}), _log_tanh({inside}))"
        if isinstance(expr, sp.Abs):
            inside = self.signed(expr.args[0])
            return f"({inside}[0] ** 2, {inside}[1])"
        if _tame(expr):
            return f"_number({self.plain(expr)})"
        raise NotApplicable(f"{expr.func.__name__} has no NumPy form here; use solve(chain.at(…)) for numbers")

    def _sum(self, expr: Any) -> str | None:
        """Write a sum of exponentials, or one with a square root, without cancellation; None if it is neither."""
        terms = as_exponentials(expr)
        if terms is not None:
            return self._total(terms)
        surd = as_surd(expr)
        if surd is None:
            return self._fraction(expr)
        plain, radical, square, below = surd
        parts = [as_exponentials(part) for part in (plain, radical, plain**2 - radical**2 * square, square)]
        if any(part is None for part in parts) or not parts[0] or not parts[1]:
            return self._fraction(expr)
        first, second, product, inside = (self._named(self._total(part or {})) for part in parts)
        root = self._named(f"_power({inside}, 1, 2)")
        text = f"_surd({first}, _times({second}, {root}), {product})"
        return f"_times({text}, _power({root}, {-below}))" if below else text

    def _fraction(self, expr: Any) -> str | None:
        """Write fractions over one denominator, so that terms that cancel meet in one sum; None if there are none."""
        import sympy as sp

        if expr.count_ops() > _JOINED:
            return None
        up, below = sp.fraction(sp.together(expr))
        if not below.has(sp.Function) or not up.is_Add:
            return None
        return f"_times({self.signed(up)}, _power({self.signed(below)}, -1))"

    def _total(self, terms: Exponentials) -> str:
        written = [f"({self.plain(c)}, {self.plain(_beta_outside(x))})" for x, c in terms.items()]
        return f"_total({', '.join(written)})" if written else "_number(0.0)"

    def _named(self, text: str) -> str:
        """Give a text a name, once."""
        if text not in self._known:
            self._known[text] = f"_{len(self._known)}"
            self.lines.append(f"{self._known[text]} = {text}")
        return self._known[text]


def _beta_outside(exponent: Any) -> Any:
    """Write β once, so that differences of energies are formed before they grow."""
    import sympy as sp

    energy = sp.expand(exponent / beta())
    return exponent if energy.has(beta()) or not energy.is_Add else sp.Mul(beta(), energy, evaluate=False)


def _tame(expr: Any) -> bool:
    """Whether a value cannot be exponentially large or small."""
    import sympy as sp

    if isinstance(expr, (sp.log, sp.acos, sp.tanh)) or not expr.has(sp.Function):
        return True
    if expr.is_Add or expr.is_Mul or expr.is_Pow or expr.func.__name__ in _TAME:
        return all(map(_tame, expr.args))
    return False
