"""Asserting that what happens in a block is refused, with a message that says why and what to do."""

from contextlib import contextmanager

import pytest


@contextmanager
def refuses(error, *fragments):
    """Expect exactly this class of error, with every fragment in its message."""
    with pytest.raises(error) as caught:
        yield
    assert type(caught.value) is error
    missing = [fragment for fragment in fragments if fragment not in str(caught.value)]
    assert not missing, f"{str(caught.value)!r} does not say {missing}"
