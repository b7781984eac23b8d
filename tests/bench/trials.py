"""Yardsticks of a trial: zgemm of OpenBLAS, and the same trial as a NumPy program. One thread.

Reads lines `zgemm N` and `numpy N`; answers each with the processor time in microseconds of one product or one
trial, over a batch of about 10 ms. `check N` answers with the mean infidelity of some trials over that of the
small-error law.
"""

import os
import sys
import time

# These would choose another kernel than the processor's fastest; they are read when the library is loaded.
for name in ("OPENBLAS_CORETYPE", "OPENBLAS_L2_SIZE"):
    os.environ.pop(name, None)
os.environ["OPENBLAS_NUM_THREADS"] = "1"

import numpy as np
import scipy
from scipy.linalg import blas

SIGMA = 0.02
BATCH_SECONDS = 0.01
rng = np.random.default_rng(1)


class Product:
    """C = A B, all three in the order of BLAS, C written in place."""

    def __init__(self, n):
        shape = (n, n)
        self.left, self.right = (
            np.asfortranarray(rng.normal(size=shape) + 1j * rng.normal(size=shape)) for _ in range(2)
        )
        self.out = np.zeros(shape, complex, order="F")
        self.repeats = 1
        self.time_of_one()
        self.repeats = 1 + int(BATCH_SECONDS / self.time_of_one())

    def time_of_one(self):
        zgemm, left, right, out = blas.zgemm, self.left, self.right, self.out
        start = time.process_time()
        for _ in range(self.repeats):
            zgemm(1.0, left, right, 0.0, out, overwrite_c=1)
        return max(1e-8, (time.process_time() - start) / self.repeats)


class Mesh:
    """A rectangular mesh with random phases; vectorised over trials and over the cells of a column."""

    def __init__(self, n):
        self.n = n
        self.columns = []
        for column in range(n):
            first = column % 2
            cells = (n - first) // 2
            internal = np.exp(1j * rng.uniform(0, np.pi, cells))
            external = np.exp(1j * rng.uniform(0, 2 * np.pi, cells))
            self.columns.append((first, cells, internal, external))
        self.target = self.matrices(1, 0.0)[0].conj()
        self.batch, self.repeats = 1, 1
        self.choose_batch()

    def splitters(self, trials, cells, sigma):
        ratio = np.clip(0.5 + sigma * rng.standard_normal((trials, cells)), 0, 1)
        return np.sqrt(1 - ratio), np.sqrt(ratio)

    def matrices(self, trials, sigma):
        fields = np.zeros((trials, self.n, self.n), complex)
        fields[:, range(self.n), range(self.n)] = 1
        for first, cells, internal, external in self.columns:
            cos_a, sin_a = self.splitters(trials, cells, sigma)
            cos_b, sin_b = self.splitters(trials, cells, sigma)
            t11 = external * (cos_b * cos_a * internal - sin_b * sin_a)
            t12 = 1j * (cos_b * sin_a * internal + sin_b * cos_a)
            t21 = 1j * external * (sin_b * cos_a * internal + cos_b * sin_a)
            t22 = cos_b * cos_a - sin_b * sin_a * internal
            upper = fields[:, first : first + 2 * cells : 2]
            lower = fields[:, first + 1 : first + 2 * cells : 2]
            new_upper = t11[..., None] * upper + t12[..., None] * lower
            lower[...] = t21[..., None] * upper + t22[..., None] * lower
            upper[...] = new_upper
        return fields

    def fidelities(self, trials):
        overlaps = np.einsum("tij,ij->t", self.matrices(trials, SIGMA), self.target)
        return np.abs(overlaps) ** 2 / self.n**2

    def choose_batch(self):
        """Small batches pay for calls, large ones leave the cache: the best of some, by the least of four times."""
        best = np.inf
        for batch in (1, 4, 16, 64, 256):
            if batch * self.n**2 > 2**20:
                break
            self.batch = batch
            took = min(self.time_of_one() for _ in range(4))
            if took < best:
                best, chosen = took, batch
        self.batch = chosen
        self.repeats = 1 + int(BATCH_SECONDS / (best * chosen))

    def time_of_one(self):
        start = time.process_time()
        for _ in range(self.repeats):
            self.fidelities(self.batch)
        return max(1e-8, (time.process_time() - start) / (self.repeats * self.batch))


MAKERS = {"zgemm": Product, "numpy": Mesh}
made = {}


def workload(kind, n):
    if (kind, n) not in made:
        made[kind, n] = MAKERS[kind](n)
    return made[kind, n]


print(f"SciPy {scipy.__version__}, NumPy {np.__version__}", flush=True)
for line in sys.stdin:
    kind, size = line.split()
    n = int(size)
    if kind == "check":
        # The variance of the ratio is that of the angle, to leading order: E[1 - F] = 2 (N - 1) sigma^2.
        found = 1 - np.mean(workload("numpy", n).fidelities(16384 // n))
        print(found / (2 * (n - 1) * SIGMA**2), flush=True)
    else:
        print(1e6 * workload(kind, n).time_of_one(), flush=True)
