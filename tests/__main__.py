"""`python3 tests` in a clone: set up .venv and a browser on first use, then run every test with pytest.

Arguments go to pytest. Standard library only, and no syntax newer than Python 3.6; see clone_environment.
"""

import os
import sys

if __name__ == "__main__":
    CLONE = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
    sys.path[0] = CLONE

    from server import clone_environment
    from tests import browser_place

    clone_environment.prepare("test")
    browser_place.prepare()
    os.chdir(CLONE)
    clone_environment.run_inside(["-m", "pytest"] + sys.argv[1:])
