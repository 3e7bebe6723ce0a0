"""Checked input of one realisation: which parameters differ from cell to cell, and their values."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from ..declare import Chain
from ..declare.values import LARGEST
from ..errors import DeclarationError, NotApplicable, ParameterError, did_you_mean, listing, unknown_parameter

__all__ = ["read_realisation", "read_row"]

_BOUNDARIES = ("open", "ring")


def read_row(chain: Any, values: Any, boundary: Any) -> tuple[dict[str, Any], dict[str, np.ndarray], int, bool]:
    """Return the parameters shared by all cells, those of each cell, the number of cells, whether it is a ring."""
    if not isinstance(chain, Chain):
        raise DeclarationError(f"realisation takes a chain with its temperature fixed, chain.fix(T=…), got {chain!r}")
    if boundary not in _BOUNDARIES:
        raise ParameterError(
            f"boundary= takes one of {listing(_BOUNDARIES)}, got {boundary!r}."
            f"{did_you_mean(str(boundary), _BOUNDARIES)}"
        )
    arrays = read_realisation(chain, values)
    if "T" not in chain.fixed:
        raise ParameterError("the temperature is not fixed; give chain.fix(T=…)")
    if not chain.fixed["T"]:
        raise NotApplicable("a realisation is summed at T > 0, got T = 0; fix a small temperature instead")
    point = chain.at(**{name: float(array[0]) for name, array in arrays.items()})
    cells = len(next(iter(arrays.values())))
    reach = max((term.reach for term in chain.terms), default=0)
    if boundary == "ring" and cells < reach + 1:
        raise ParameterError(
            f"a ring of this chain has at least {reach + 1} cells, because the longest term spans {reach} cells "
            f"further; got {cells} values per parameter"
        )
    shared = {name: value for name, value in point.values.items() if name not in arrays}
    return shared, arrays, cells, boundary == "ring"


def read_realisation(chain: Chain, values: Any) -> dict[str, np.ndarray]:
    """Check arrays of parameters, one finite number per cell, all of one length."""
    if not isinstance(values, Mapping) or not values:
        raise DeclarationError(
            f'a realisation gives parameters one value per cell, as in {{"h": array_of_length_N}}, got {values!r}'
        )
    arrays: dict[str, np.ndarray] = {}
    for name, given in values.items():
        _check_name(chain, name)
        arrays[name] = _numbers(name, given)
    first = next(iter(arrays))
    for name, array in arrays.items():
        if len(array) != len(arrays[first]):
            raise ParameterError(
                f"{first!r} has {len(arrays[first])} values and {name!r} has {len(array)}; every parameter needs one "
                "value per cell"
            )
    return arrays


def _check_name(chain: Chain, name: Any) -> None:
    if name == "T":
        raise ParameterError("T cannot differ from cell to cell; one holds for the whole chain: chain.fix(T=…)")
    if name not in chain.parameters:
        raise unknown_parameter(name, chain.parameters)
    if name in chain.fixed:
        raise ParameterError(
            f"parameter {name!r} is fixed in this chain and has values per cell as well; leave one of them out"
        )
    if not any(name in term.parameters for term in chain.terms):
        raise ParameterError(
            f"parameter {name!r} occurs in observables only; values per cell belong to an energy or a weight"
        )


def _numbers(name: str, given: Any) -> np.ndarray:
    try:
        if isinstance(given, str):
            raise ValueError(given)
        array = np.array(given)
        if np.iscomplexobj(array):
            raise ValueError("complex numbers")
        array = array.astype(np.float64)
    except (TypeError, ValueError) as cause:
        raise ParameterError(f"{name!r} takes real numbers, one per cell, got {given!r}") from cause
    if array.ndim != 1 or not len(array):
        raise ParameterError(f"{name!r} takes a list of numbers, one per cell, got an array of shape {array.shape}")
    if not np.isfinite(array).all():
        cell = int(np.flatnonzero(~np.isfinite(array))[0])
        raise ParameterError(f"{name!r} must be finite in every cell, got {array[cell]} in cell {cell}")
    largest = int(np.abs(array).argmax())
    if abs(array[largest]) > LARGEST:
        raise ParameterError(
            f"{name!r} is {array[largest]:g} in cell {largest}, beyond 1e50; measure energies in a larger unit"
        )
    array.flags.writeable = False
    return array
