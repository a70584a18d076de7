"""Floor 4: the web application, the link store and the command line. Knows designs, never numerics.

Standard library only, and no syntax newer than Python 3.6: the bootstraps import this package before
anything is installed, and must still be able to say that a Python is too old.
"""

import os

# One thread for linear algebra: the matrices are small, a pool of threads only adds waiting, and sums taken in
# another order would give other last digits. Must be set before numpy is loaded.
for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS"):
    os.environ.setdefault(_name, "1")
