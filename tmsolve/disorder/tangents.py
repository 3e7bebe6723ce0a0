"""Which derivatives are carried along a product: by temperature, by fields, by every smooth parameter."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import combinations_with_replacement

import numpy as np

from ..errors import NotApplicable, ParameterError, SolveError
from .problem import Problem
from .steps import BETA, StepMaker, observable

__all__ = ["with_tangents"]

#: Observables up to which all pairs of them are carried along.
_PAIRED = 3


def with_tangents(problem: Problem, derivatives: Iterable[tuple[str, str]] = ()) -> StepMaker:
    """Choose the tangents: temperature, observables, and every parameter that the energy is smooth in."""
    observed = [observable(name) for name in problem.observables]
    tilts = [BETA, *observed]
    tilts += [name for name in problem.parameters if _smooth(problem, name)]
    pairs = [(BETA, BETA)]
    few = len(observed) <= _PAIRED
    pairs += list(combinations_with_replacement(observed, 2)) if few else [(a, a) for a in observed]
    for names in derivatives:
        if not isinstance(names, (tuple, list)) or len(names) != 2:
            raise ParameterError(f'derivatives= takes pairs of names such as ("J", "h"), got {names!r}')
        pair = [_tilt(problem, name) for name in names]
        for name in pair:
            if name not in tilts:
                raise ParameterError(f"the energy has no smooth parameter {name!r} to differentiate by")
        pairs.append((pair[0], pair[1]))
    numbers = {tuple(sorted((tilts.index(a), tilts.index(b)))) for a, b in pairs}
    return StepMaker(problem, tuple(tilts), tuple(sorted((i, j) for i, j in numbers)))


def _tilt(problem: Problem, name: str) -> str:
    if name == "T":
        return BETA
    return observable(name) if name in problem.observables and name not in problem.parameters else name


def _smooth(problem: Problem, name: str) -> bool:
    """Whether the energy has a derivative by a parameter at every value it takes, and forbids the same at all."""
    probe = StepMaker(problem, (name,))
    some = {copy: law.quadrature(4)[0] if law.support else np.array([law.mean]) for copy, law, _, _ in problem.draws}
    count = max(len(values) for values in some.values())
    try:
        steps = probe.steps({copy: np.resize(values, count) for copy, values in some.items()}, count)
    except (NotApplicable, SolveError):
        return False
    forbidden = steps.log == -np.inf
    return name not in problem.laws or bool((forbidden.all(axis=-1) == forbidden.any(axis=-1)).all())
