"""Ground states as text."""

from __future__ import annotations

from fractions import Fraction
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .components import Component
    from .states import GroundState

__all__ = ["number_text", "report", "results", "value_text"]

_SHOWN = 12


def number_text(value: Any) -> str:
    """Return a number as it was meant: a decimal where it is one, else a fraction; floats to 12 digits.

    Examples
    --------
    >>> number_text(Fraction(9, 10)), number_text(Fraction(-1, 3)), number_text(2.0)
    ('0.9', '-1/3', '2')
    """
    if isinstance(value, Fraction) and value.denominator != 1:
        short = repr(float(value))
        return short if Fraction(short) == value else str(value)
    return str(value) if isinstance(value, (int, Fraction)) else f"{value:.12g}"


def value_text(value: Fraction) -> str:
    """Return an exact value together with its decimal form where that is rounded.

    Examples
    --------
    >>> value_text(Fraction(-1, 3)), value_text(Fraction(1, 2))
    ('-1/3 = -0.333333333333', '0.5')
    """
    text = number_text(value)
    return f"{text} = {float(value):.12g}" if "/" in text else text


def report(state: GroundState) -> str:
    """Return everything about a ground state as lines of text."""
    values = ", ".join(f"{name} = {number_text(value)}" for name, value in state.parameters.items())
    return f"ground states of {state.chain.name}" + (f" at {values}" if values else "") + "\n" + results(state)


def results(state: GroundState) -> str:
    """Return what was found, without chain and parameters."""
    lines = [
        f"energy per cell   {value_text(state.energy)}" + ("" if state.exact else "  (inexact)"),
        f"residual entropy  {_entropy(state)}",
        f"excitations       {_gap(state)}",
    ]
    for name, mean in state.means.items():
        shown = "unresolved" if mean is None else number_text(mean)
        lines.append(f"mean({name})".ljust(18) + shown)
    kinds = " ".join(state.chain.cell)
    lines += ["", f"{len(state.components)} component{'s' * (len(state.components) != 1)}, cells as ({kinds}):"]
    for part in state.components[:_SHOWN]:
        lines.append(f"  {_component(part)}")
    if len(state.components) > _SHOWN:
        lines.append(f"  … and {len(state.components) - _SHOWN} more")
    lines += [f"note: {note}" for note in state.notes]
    return "\n".join(lines)


def _entropy(state: GroundState) -> str:
    if state.entropy == 0:
        return "0"
    return f"{state.entropy_text} = {state.entropy:.12g}"


def _gap(state: GroundState) -> str:
    gap = state.gap
    if gap.energy is None:
        return "none: every allowed configuration is a ground state"
    walks = "; ".join(str(walk.cells) for walk in gap.walks[:3])
    return (
        f"ln(lambda/rho) ~ A exp(-Delta/T), Delta = {value_text(gap.energy)}, A = {gap.amplitude:.10g}; through {walks}"
    )


def _component(part: Component) -> str:
    examples = " ".join(str(item) for item in part.examples)
    if part.entropy == 0:
        many = "" if part.degeneracy == 1 else f", {part.degeneracy} translates"
        return f"{examples}  period {part.period}{many}"
    return f"{examples} …  period {part.period}, entropy {part.growth.text}"
