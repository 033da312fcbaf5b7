"""Two straight thin strips anywhere in the plane, neutral pair in free space: charge, force, torque; double precision.

The charge on a strip is q(t)/sqrt(1 - t^2), t in [-1, 1]. The logarithmic kernel is diagonal in Chebyshev polynomials
on the strip itself; the kernel between the strips is smooth and taken at the Chebyshev nodes. Unknowns are the nodal q
and a common offset of the potentials, fixed by zero total charge. Force and torque on a strip come from the field of the
other one alone. N nodes per strip; N ~ 30 (length / smallest gap) gives 1e-14. eps0 = 1, V = 1.
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np


def solve(upper, lower, N, pivot=(0.0, 0.0)):
    """upper, lower: ((x, z) of one end, (x, z) of the other). -> capacitance, force (x, z) on the upper strip,
    torque_y on it about `pivot`, right-handed about +y (clockwise with x to the right and z up)"""
    angle = (2 * np.arange(N) + 1) * np.pi / (2 * N)
    n = np.arange(1, N)
    T = np.cos(np.outer(angle, n))
    log_on_strip = -np.pi * np.log(2) / N - (T * (np.pi / n)) @ ((2 / N) * T.T)

    def place(ends):
        a, b = np.array(ends, float)
        return 0.5 * (a + b) + 0.5 * np.cos(angle)[:, None] * (b - a), np.hypot(*(b - a))
    (X1, L1), (X2, L2) = place(upper), place(lower)
    own = lambda L: -(log_on_strip + np.log(L / 2) * np.pi / N) / (2 * np.pi)
    D = X1[:, None] - X2[None]
    R2 = (D ** 2).sum(-1)
    cross = -0.5 * np.log(R2) / (2 * N)
    A = np.zeros((2 * N + 1, 2 * N + 1))
    A[:N, :N], A[:N, N:-1], A[N:-1, :N], A[N:-1, N:-1] = own(L1), cross, cross.T, own(L2)
    A[:-1, -1], A[-1, :-1] = -1, 1 / N
    b = np.concatenate([np.full(N, 0.5), np.full(N, -0.5), [0.0]])
    x = np.linalg.solve(A, b)
    q1, q2 = x[:N] * np.pi / N, x[N:-1] * np.pi / N
    f = q1[:, None] * (D / R2[..., None] * q2[None, :, None]).sum(1) / (2 * np.pi)
    r = X1 - np.array(pivot, float)
    return q1.sum(), f.sum(0), (r[:, 1] * f[:, 0] - r[:, 0] * f[:, 1]).sum()
