"""Settling where terms and observables act in a given unit cell."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from ..errors import DeclarationError, did_you_mean, listing
from .states import StateSet
from .terms import Term, site

__all__ = ["resolve_observables", "resolve_terms"]


def resolve_terms(cell: Mapping[str, StateSet], terms: Any) -> tuple[Term, ...]:
    """Give every term its kinds of site; `site` without a kind acts on all of them."""
    if isinstance(terms, Term):
        raise DeclarationError("the terms of a chain come in a list: Chain(states, [term, …])")
    if isinstance(terms, Mapping) or not isinstance(terms, Iterable):
        raise DeclarationError(f"the terms of a chain come in a list, got {terms!r}")
    resolved: list[Term] = []
    for item in terms:
        if not isinstance(item, Term):
            hint = "wrap it in site(…) or bond(…)" if callable(item) else "make terms with site, bond, term or weight"
            raise DeclarationError(f"expected a term, got {item!r}; {hint}")
        resolved.extend(_resolve(cell, item))
    return tuple(resolved)


def _resolve(cell: Mapping[str, StateSet], item: Term) -> list[Term]:
    kinds = [kind for kind, _ in item.places]
    for kind in kinds:
        if kind is not None and kind not in cell:
            raise DeclarationError(
                f"{item.name} is placed on a site of kind {kind!r}; this cell has {listing(cell)}."
                f"{did_you_mean(kind, cell)}"
            )
    if None not in kinds:
        return [item]
    if len(item.places) == 1:
        return [item.placed([(kind, item.places[0][1])]) for kind in cell]
    if len(cell) > 1:
        raise DeclarationError(
            f"{item.name} acts on {len(item.places)} sites of a cell of several kinds ({listing(cell)}); "
            'say which, as in bond(f, ("a", "b"), shift=0)'
        )
    only = next(iter(cell))
    return [item.placed([(only, shift) for _, shift in item.places])]


def resolve_observables(cell: Mapping[str, StateSet], observables: Any) -> dict[str, tuple[Term, ...]]:
    """Turn each observable into placed terms; a bare function is summed over the cell."""
    if observables is None:
        return {}
    if not isinstance(observables, Mapping):
        raise DeclarationError(f'observables= takes a mapping such as {{"m": lambda s: s}}, got {observables!r}')
    resolved: dict[str, tuple[Term, ...]] = {}
    for name, given in observables.items():
        if not isinstance(name, str) or not name or set(name) & set("(),= @|"):
            raise DeclarationError(
                f"an observable is named by a word without spaces, commas, brackets, '=', '@' or '|', got {name!r}"
            )
        parts = list(given) if isinstance(given, (list, tuple)) else [given]
        if not parts:
            raise DeclarationError(f"observable {name!r} is an empty list; give a function or placed terms")
        resolved[name] = tuple(_observable(name, part, cell) for part in _expand(name, parts, cell))
    return resolved


def _expand(name: str, parts: list[Any], cell: Mapping[str, StateSet]) -> list[Term]:
    placed: list[Term] = []
    for part in parts:
        if not isinstance(part, Term) and not callable(part):
            raise DeclarationError(
                f"observable {name!r} must be a function of one state or a placed term, got {part!r}"
            )
        placed.extend(_resolve(cell, part if isinstance(part, Term) else site(part)))
    return placed


def _observable(name: str, part: Term, cell: Mapping[str, StateSet]) -> Term:
    if part.role == "weight":
        raise DeclarationError(f"observable {name!r} is a weight(…); place it with site, bond or term")
    if part.takes_temperature:
        raise DeclarationError(f"observable {name!r} takes T; an observable depends on states and parameters only")
    return part.as_role("observable")
