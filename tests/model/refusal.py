"""One way to test that a mistake is refused with its place and its remedy."""

from __future__ import annotations

from collections.abc import Callable

import pytest

from engine.errors import DesignError


def refused(build: Callable[[], object], where: str, *words: str) -> None:
    """`build` raises one DesignError at `where`, on one line, that contains all of `words`."""
    with pytest.raises(DesignError) as caught:
        build()
    (fault,) = caught.value.faults
    assert fault.where == where, str(fault)
    assert "\n" not in fault.what
    assert len(fault.what) < 200
    for word in words:
        assert word in fault.what, str(fault)
