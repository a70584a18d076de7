"""How often Python looks for garbage while a hand waits."""

from __future__ import annotations

import gc

# A full assessment makes some ten thousand objects; Python would look through the youngest of them a dozen times.
_YOUNG = 50_000


def settle_collector() -> None:
    """Leave what is loaded out of every later search for garbage, and search less often."""
    gc.collect()
    gc.freeze()
    gc.set_threshold(_YOUNG, 20, 20)
