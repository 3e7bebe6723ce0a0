"""Asserting that something is refused, with a message that says what was got, what was expected, what to do."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest


def refused(error: type[Exception], act: Callable[[], Any], *fragments: str) -> Exception:
    """Check that ``act`` raises exactly this class and that its message holds every fragment."""
    with pytest.raises(error) as caught:
        act()
    assert type(caught.value) is error
    message = str(caught.value)
    missing = [fragment for fragment in fragments if fragment not in message]
    assert not missing, f"{message!r} does not say {missing}"
    return caught.value
