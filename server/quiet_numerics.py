"""What numpy remarks about overflow is nothing for the user of a command or the log of a server."""

from __future__ import annotations

import sys
import warnings


def quiet_numerics() -> None:
    """Leave such warnings out, unless they were asked for with -W; in the tests each is a failure."""
    if not sys.warnoptions:
        warnings.filterwarnings("ignore", category=RuntimeWarning)
