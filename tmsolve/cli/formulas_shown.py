"""Derived quantities as text, as LaTeX and as data."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from .outcome import UsageError
from .table import table

if TYPE_CHECKING:
    from .derivation import Derivation
    from .formulas import Formula

__all__ = ["as_data", "as_latex", "as_mathml", "as_numpy", "as_text"]


def as_text(formula: Formula, value: Any, work: Derivation) -> str:
    """Return ``symbol = formula``, or a list with one formula per line."""
    if formula.kind in ("series", "limits", "counts", "zeros"):
        return str(value)
    data = as_data(formula, value, work)
    if formula.kind == "eigenvalues":
        return _listed("eigenvalues (multiplicity)", [f"{item['value']}  ({item['multiplicity']})" for item in data])
    if formula.kind == "blocks":
        return _listed(
            "blocks",
            [f"{item['size']} x {item['size']}, {item['multiplicity']} times: {item['label']}" for item in data],
        )
    if formula.kind == "recurrence":
        sum_ = " + ".join(f"c_{k} Z_(N-{k})" for k in range(1, len(data) + 1))
        return _listed(f"Z_N = {sum_}  for N > {len(data)}", [f"c_{k} = {c}" for k, c in enumerate(data, start=1)])
    if formula.kind == "matrix":
        return "transfer matrix\n" + table(data, indent="  ")
    return f"{formula.symbol} = {data}"


def _listed(head: str, lines: list[str]) -> str:
    return "\n".join([head, *(f"  {line}" for line in lines)])


def as_data(formula: Formula, value: Any, work: Derivation) -> Any:
    """Return texts that read back as Python, in lists where there are several."""
    from ..symbolic.plain import plain_text
    from ..symbolic.report import ring_text

    if formula.symbol == "Z_N" and not work.opened:
        return ring_text(work.form)
    if formula.kind == "counts":
        return {"names": list(value.names), "counts": [[*map(str, key), str(count)] for key, count in value.items()]}
    if formula.kind == "zeros":
        return {
            "variable": value.variable,
            "zeros": [
                [_long(z.real), _long(z.imag), times]
                for z, times in zip(value.zeros, value.multiplicities, strict=True)
            ],
            "error": float(value.error),
        }
    if formula.kind in ("series", "limits"):
        return _expanded(formula.kind, value)
    if formula.kind == "eigenvalues":
        return [{"value": plain_text(item), "multiplicity": _count(times)} for item, times in value]
    if formula.kind == "blocks":
        return [
            {"size": block.size, "multiplicity": _count(block.multiplicity), "label": block.label} for block in value
        ]
    if formula.kind == "recurrence":
        return [plain_text(item) for item in value]
    if formula.kind == "matrix":
        return [[plain_text(item) for item in row] for row in value.tolist()]
    return plain_text(value)


def as_latex(formula: Formula, value: Any, work: Derivation) -> str:
    """Return one equation per line, without dollar signs."""
    from ..symbolic.plain import latex_text
    from ..symbolic.report import ring_latex

    if formula.symbol == "Z_N" and not work.opened:
        return f"{formula.latex} = {ring_latex(work.form)}"
    if formula.kind == "eigenvalues":
        return "\n".join(
            rf"\lambda_{{{k}}} = {latex_text(item)}" + _latex_times(times)
            for k, (item, times) in enumerate(value, start=1)
        )
    if formula.kind == "series":
        return value.latex.strip("$")
    if formula.kind in ("limits", "counts", "zeros"):
        return _verbatim(str(value))
    if formula.kind == "recurrence":
        return "\n".join(f"c_{{{k}}} = {latex_text(item)}" for k, item in enumerate(value, start=1))
    if formula.kind == "blocks":
        sizes = (rf"{_latex_count(block.multiplicity)} \times [{block.size} \times {block.size}]" for block in value)
        return r"M \simeq " + r" \oplus ".join(sizes)
    return f"{formula.latex} = {latex_text(value)}"


def _count(multiplicity: Any) -> int | str:
    """Return a multiplicity as a number, or as text where it is a polynomial in a number of colours."""
    from ..symbolic.plain import plain_text

    return multiplicity if isinstance(multiplicity, int) else plain_text(multiplicity)


def _latex_times(multiplicity: Any) -> str:
    if isinstance(multiplicity, int):
        return rf" \quad \text{{({multiplicity} times)}}" if multiplicity > 1 else ""
    return rf" \quad ({_latex_count(multiplicity).strip('()')} \text{{ times}})"


def _latex_count(multiplicity: Any) -> str:
    from ..symbolic.multiplicity import factor_text
    from ..symbolic.plain import latex_text

    return str(multiplicity) if isinstance(multiplicity, int) else factor_text(multiplicity, latex_text(multiplicity))


def _long(number: Any) -> str:
    """Return a long number with the digits that zeros are known to."""
    import mpmath as mp

    text: str = mp.nstr(number, 30)
    return text


def as_mathml(formula: Formula, value: Any, work: Derivation) -> str:
    """Return a formula as a MathML element."""
    from ..symbolic.export.mathml import mathml

    if not hasattr(value, "free_symbols"):
        raise UsageError(f"--mathml writes single formulas; {formula.name} is none. Use --latex or --json")
    return mathml(value, left=_symbol(formula))


def _symbol(formula: Formula) -> Any:
    import sympy as sp

    return sp.Symbol({"mean": f"<{', '.join(formula.arguments)}>"}.get(formula.kind, formula.symbol))


def as_numpy(formula: Formula, value: Any, work: Derivation) -> str:
    """Return the text of a NumPy function."""
    from ..answer.exported import numpy_function

    if formula.kind not in ("f", "u", "s", "c", "xi", "mean", "chi"):
        raise UsageError(f"--numpy writes f, u, s, c, xi, mean(a) and chi(a); {formula.name} is none of them")
    name = formula.name.replace("chi(", "susceptibility(")
    source: str = numpy_function(work.form, name).source
    return source


def _verbatim(text: str) -> str:
    """Return a table as LaTeX."""
    return "\n".join([r"\begin{verbatim}", text, r"\end{verbatim}"])


def _expanded(kind: str, value: Any) -> Any:
    """Return the terms of a series, or those of all limits."""
    if kind == "limits":
        return {end: {name: _terms(item) for name, item in getattr(value, end).items()} for end in ("high", "low")}
    return _terms(value)


def _terms(series: Any) -> Any:
    from ..symbolic.plain import plain_text

    return {
        "of": series.of,
        "about": series.about,
        "order": series.order,
        "terms": [
            {"coefficient": plain_text(c), "power": str(power), "energy": plain_text(energy)}
            for c, power, energy in series.terms
        ],
    }
