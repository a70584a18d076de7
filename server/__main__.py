"""`python3 server` in a clone: set up .venv on first use, then start Loopwright inside, with the options given.

Standard library only, and no syntax newer than Python 3.6; see clone_environment.
"""

import os
import sys

if __name__ == "__main__":
    if __package__:  # python -m server: the environment is already chosen
        from server.command_line import main

        sys.exit(main())
    sys.path[0] = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))

    from server import clone_environment

    clone_environment.prepare()
    # -P: the folder one happens to be in may hold a package called server too.
    clone_environment.run_inside(["-P", "-m", "server"] + sys.argv[1:])
