"""Recomputes truncation.json: two equal thin strips, w = 1, in a circle of radius R about the centre of the pair.

The circle is grounded or insulated; its image kernel is exact. The charge of each strip is q(t)/sqrt(1 - t^2), the
logarithmic kernel is diagonal in Chebyshev polynomials on the strip itself and smooth elsewhere.

    python truncation.py [PART OF A NAME ...] [--update]
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np

import store

N = 400                                                  # nodes per strip


def capacitance(gap, radius=None, grounded=True):
    """capacitance per unit width of the strip pair at +-1/2 V; radius None: free space"""
    j = np.arange(N)
    angle = (2 * j + 1) * np.pi / (2 * N)
    n = np.arange(1, N)
    T = np.cos(np.outer(angle, n))
    own = np.pi * np.log(2) / N * np.ones((N, N)) + (T * (np.pi / n)) @ ((2 / N) * T.T) - np.log(0.5) * np.pi / N
    upper = 0.5 * np.cos(angle) + 0.5j * gap
    lower = upper.conj()
    A = own + np.pi / N * np.log(np.abs(upper[:, None] - lower[None]))
    if radius is not None:
        image = lambda s: np.pi / N * np.log(np.abs(1 - upper[:, None] * s.conj()[None] / radius ** 2))
        A = A + (1 if grounded else -1) * (image(upper) - image(lower))
    return (np.linalg.solve(A / (2 * np.pi), 0.5 * np.ones(N)) * np.pi / N).sum()


def compute(case, args):
    gap, radius = case["geometry"]["gap"], case["geometry"]["radius"]
    free = capacitance(gap)
    grounded, insulated = (capacitance(gap, radius, g) / free - 1 for g in (True, False))
    return dict(grounded=grounded, insulated=insulated, mean=(grounded + insulated) / 2,
                leading_term=gap ** 2 * free / (2 * np.pi * radius ** 2))


if __name__ == "__main__":
    store.run("truncation", compute)
