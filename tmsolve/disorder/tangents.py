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
    pairs += list(combinations_with_replacement(observed, 2)) if len(observed) <= _PAIRED else [(a, a) for a in observed]
    for names in derivatives:
        if not isinstance(names, (tuple, list)) or len(names) != 2:
            raise ParameterError(f'derivatives= takes pairs of names such as ("J", "h"), got {names!r}')
        pair = [BETA if name == "T" else name for name in names]
        for name in pair:
            if name not in tilts:
                raise ParameterError(f"the energy has no smooth parameter {name!r} to differentiate by")
        pairs.append((pair[0], pair[1]))
    numbers = {tuple(sorted((tilts.index(a), tilts.index(b)))) for a, b in pairs}
    return StepMaker(problem, tuple(tilts), tuple(sorted((i, j) for i, j in numbers)))


def _smooth(problem: Problem, name: str) -> bool:
    probe = StepMaker(problem, (name,))
    drawn = {copy: np.full(1, law.quadrature(4)[0][0] if law.support else law.mean) for copy, law, _, _ in problem.draws}
    try:
        probe.steps(drawn, 1)
    except (NotApplicable, SolveError):
        return False
    return True
