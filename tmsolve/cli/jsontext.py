"""Results as JSON: numbers round-trip, and what JSON has no number for is null and listed."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from fractions import Fraction
from typing import Any

__all__ = ["json_text"]


def json_text(document: Mapping[str, Any], indent: int | None = 2) -> str:
    """Return a document as JSON text, on one line where ``indent`` is None.

    JSON has no inf and no NaN: they become null, and the key ``"nonfinite"`` maps the place of each to
    ``"inf"``, ``"-inf"`` or ``"nan"``.

    Examples
    --------
    >>> print(json_text({"xi": float("inf"), "f": 0.1}))
    {
      "xi": null,
      "f": 0.1,
      "nonfinite": {
        "xi": "inf"
      }
    }
    """
    lost: dict[str, str] = {}
    plain = _plain(document, "", lost)
    if lost:
        plain["nonfinite"] = lost
    return json.dumps(plain, indent=indent, ensure_ascii=False, allow_nan=False)


def _plain(value: Any, place: str, lost: dict[str, str]) -> Any:
    if isinstance(value, Mapping):
        return {str(key): _plain(item, f"{place}.{key}" if place else str(key), lost) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(item, f"{place}[{i}]", lost) for i, item in enumerate(value)]
    if value is None or isinstance(value, (str, bool, int)):
        return value
    if isinstance(value, Fraction):
        return int(value) if value.denominator == 1 else float(value)
    if hasattr(value, "tolist"):
        # NumPy arrays and scalars.
        return _plain(value.tolist(), place, lost)
    if isinstance(value, float):
        if math.isfinite(value):
            return value
        lost[place] = str(value)
        return None
    return str(value)
