"""A chain in words and as a table: sites, terms, cut, matrix, symmetries."""

from __future__ import annotations

import inspect
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from ..declare import Chain, Point, Term
from ..errors import DeclarationError, listing
from ..tabulate.affine import affine_table
from ..tabulate.colours import numbers_of_colours, token_chain
from .allowed import allowed_entries
from .trivial_symmetries import trivial_symmetries
from .window import build_window, token_window

__all__ = ["Description", "describe"]


@dataclass(frozen=True)
class Description:
    """What `describe` found; prints as text.

    Attributes
    ----------
    name : str
        Title of the chain.
    sites : tuple of (kind, number of states, labels)
        The number is text where it is a symbol.
    terms : tuple of (role, text, places, parameters)
    parameters : tuple of (name, value or None)
        Fixed or default values where there are any.
    observables : tuple of (name, places)
    cut, interior : tuple of str
        Sites of the left cut, and sites summed out, as ``kind[cell]``.
    matrix : (int, int)
        Rows and columns of the transfer matrix; text such as ``"q^2"`` where the number of colours is a symbol.
    nonzeros : int
        Entries that the cut allows; text likewise.
    range : int
        Cells that the longest term spans.
    symmetries : tuple of str
        State permutations that leave every term unchanged.
    """

    name: str
    sites: tuple[tuple[str, int | str, tuple[str, ...]], ...]
    terms: tuple[tuple[str, str, str, str], ...]
    parameters: tuple[tuple[str, str], ...]
    observables: tuple[tuple[str, str], ...]
    cut: tuple[str, ...]
    interior: tuple[str, ...]
    matrix: tuple[int | str, int | str]
    nonzeros: int | str
    range: int
    symmetries: tuple[str, ...]

    def __str__(self) -> str:
        rows, columns = self.matrix
        full = isinstance(rows, int) and isinstance(columns, int) and self.nonzeros == rows * columns
        density = f"{self.nonzeros} non-zeros" + (" (full)" if full else "")
        cell = ", ".join(f"{kind} with {count} states ({_short(labels)})" for kind, count, labels in self.sites)
        lines = [
            f"{self.name}: unit cell of {len(self.sites)} site{'s' * (len(self.sites) > 1)}: {cell}",
            f"The longest term spans {self.range} cell{'s' * (self.range != 1)}; "
            f"the smallest cut is {listing(self.cut)}"
            + (f"; summed out: {listing(self.interior)}" if self.interior else ""),
            f"Transfer matrix {rows}×{columns} per cell, {density}",
            "",
            *_table(("role", "function", "places", "parameters"), self.terms),
            "",
            *_table(("parameter", "value"), self.parameters),
            "",
            *_table(("observable", "places"), self.observables),
            "",
            f"Symmetries of every term: {listing(self.symmetries)}",
        ]
        return "\n".join(lines)


def _short(labels: Sequence[str]) -> str:
    return ", ".join(labels) if len(labels) <= 8 else ", ".join([*labels[:3], "…", labels[-1]])


def _table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> list[str]:
    if not rows:
        return [f"no {head[0]}s"]
    widths = [max(len(row[i]) for row in (head, *rows)) for i in range(len(head))]
    lines = [
        "  ".join(text.ljust(width) for text, width in zip(row, widths, strict=True)).rstrip() for row in (head, *rows)
    ]
    return [lines[0], "  ".join("─" * width for width in widths), *lines[1:]]


def describe(chain: Chain | Point) -> Description:
    """Say what a chain is and what will be computed for it; computes no physics.

    Parameters
    ----------
    chain : Chain or Point

    Examples
    --------
    >>> from tmsolve import Chain, bond, describe, spins
    >>> text = str(describe(Chain(spins(1), [bond(lambda s, t, J: -J*s*t), bond(lambda s, t, K: -K*s*t, shift=2)])))
    >>> "Transfer matrix 9×9 per cell, 27 non-zeros" in text
    True
    """
    if isinstance(chain, Point):
        chain = chain.chain
    if not isinstance(chain, Chain):
        raise DeclarationError(f"describe takes a chain, got {chain!r}")
    symbolic = bool(numbers_of_colours(chain))
    # Cuts and symmetries are those of a few colours that stand for all of them.
    window = token_window(token_chain(chain, chain.terms)) if symbolic else build_window(chain)
    return Description(
        name=chain.name,
        sites=tuple((kind, states.number or len(states), states.labels) for kind, states in chain.cell.items()),
        terms=tuple(_term_row(term, chain) for term in chain.terms),
        parameters=tuple((name, _value(chain, name)) for name in chain.parameters),
        observables=tuple((name, "; ".join(_places(t) for t in parts)) for name, parts in chain.observables.items()),
        cut=tuple(_site(site) for site in window.left),
        interior=tuple(_site(site) for site in window.interior),
        matrix=(_size(chain, window.left), _size(chain, window.right)) if symbolic else window.shape,
        nonzeros=_size(chain, window.sites) if symbolic else allowed_entries(chain),
        range=chain.reach,
        symmetries=tuple(_exchanges(chain) if symbolic else trivial_symmetries(chain)),
    )


def _size(chain: Chain, sites: Sequence[tuple[str, int]]) -> str:
    """Return the number of joint states of some sites as text, such as ``2·q^2``."""
    count, powers = 1, dict.fromkeys(numbers_of_colours(chain), 0)
    for kind, _ in sites:
        states = chain.cell[kind]
        if states.number is None:
            count *= len(states)
        else:
            powers[states.number] += 1
    parts = [f"{name}^{power}" if power > 1 else name for name, power in powers.items() if power]
    return "·".join(parts if parts and count == 1 else [str(count), *parts])


def _exchanges(chain: Chain) -> list[str]:
    first = {states.number: states.special for states in chain.cell.values() if states.number is not None}
    return [
        f"any permutation of the {number} colours" + (f" other than {listing(special)}" if special else "")
        for number, special in first.items()
    ]


def _site(site: Any) -> str:
    kind, cell = site
    return f"{kind}[n]" if cell == 0 else f"{kind}[n{cell:+d}]"


def _places(term: Term) -> str:
    return ", ".join(_site(place) for place in term.places)


def _term_row(term: Term, chain: Chain) -> tuple[str, str, str, str]:
    affine = (
        term.role == "energy" and affine_table(term, [chain.cell[kind] for kind, _ in term.places if kind]) is not None
    )
    parameters = ", ".join(term.parameters) or "–"
    return term.role + (" (linear)" if affine else ""), _source(term), _places(term), parameters


def _source(term: Term) -> str:
    """Return the text of a one-line function, or its name."""
    try:
        text = inspect.getsource(term.function).strip()
    except (OSError, TypeError):
        return term.name
    if term.function.__name__ != "<lambda>" or "\n" in text or text.count("lambda") != 1:
        return term.name
    return _lambda_text(text[text.index("lambda") :])


def _lambda_text(text: str) -> str:
    """Cut a lambda out of the line it stands on: up to the bracket or comma that ends it."""
    depth = 0
    colon = text.index(":")
    for i, letter in enumerate(text):
        if letter in "([{":
            depth += 1
        elif letter in ")]}":
            depth -= 1
        if depth < 0 or (letter == "," and depth == 0 and i > colon):
            return text[:i].strip()
    return text.strip()


def _value(chain: Chain, name: str) -> str:
    if name in chain.fixed:
        return f"{float(chain.fixed[name]):g} (fixed)"
    return f"{float(chain.defaults[name]):g} (default)" if name in chain.defaults else "free"
