"""Yardstick: LAPACK's zgeqrf (lwork = 32 n, one thread). Reads one N a line, answers with the median in us."""

import os
import sys
import time

# These would choose another kernel than the processor's fastest; they are read when the library is loaded.
for name in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"):
    os.environ.pop(name, None)
os.environ["OPENBLAS_NUM_THREADS"] = "1"

import numpy as np
import scipy
from scipy.linalg import lapack


def median_time(n, generator):
    """Runs are short ones put together to 0.2 ms, for half a second."""
    normals = generator.normal(size=(n, n)) + 1j * generator.normal(size=(n, n))
    unitary = np.asfortranarray(np.linalg.qr(normals)[0])
    lapack.zgeqrf(unitary, lwork=32 * n)
    start = time.perf_counter()
    lapack.zgeqrf(unitary, lwork=32 * n)
    together = 1 + int(2e-4 / (time.perf_counter() - start))
    times = []
    end = time.perf_counter() + 0.5
    while len(times) < 3 or time.perf_counter() < end:
        start = time.perf_counter()
        for _ in range(together):
            lapack.zgeqrf(unitary, lwork=32 * n)
        times.append((time.perf_counter() - start) / together)
    return 1e6 * sorted(times)[len(times) // 2]


print(f"SciPy {scipy.__version__}, NumPy {np.__version__}", flush=True)
rng = np.random.default_rng(1)
for line in sys.stdin:
    print(median_time(int(line), rng), flush=True)
