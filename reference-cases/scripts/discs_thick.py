"""Recomputes discs-thick.json: two coaxial discs of finite thickness in free space, by an axisymmetric integral equation.

The potential of the charge on both surfaces, rings of charge density sigma around the axis,

    phi(x) = int sigma(x') rho' K(m) / (pi R) ds',   R^2 = (rho + rho')^2 + (z - z')^2,   m = 4 rho rho' / R^2,

is put equal to the voltage at the Gauss points of panels of order POINTS, which halve towards the edges, where
sigma ~ r^(-1/3). A panel acts on its own points by Gauss points crowded towards the point (which resolve the logarithm), on
points nearer than its length by halving it towards them. K is the complete elliptic integral.

The axial force on the upper disc is the integral of its charge in the field of the lower one, which feels the singular
charge of the edges only weakly. That field holds E, the complete elliptic integral of the second kind.

    python discs_thick.py [PART OF A NAME ...] [--levels N] [--update]

--levels: halvings towards an edge (default 26). Twenty seconds a case.
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
from numpy.polynomial.legendre import leggauss, legvander
from scipy.special import ellipe, ellipkm1

import store

POINTS = 12                                              # a panel
OWN, CROWDING = 24, 6                                    # points on each side of a panel's own point, t = u^CROWDING
LEVELS = 26
LONGEST = 0.25                                           # panel, in radii
NODES, WEIGHTS = leggauss(POINTS)
TO_LEGENDRE = np.linalg.inv(legvander(NODES, POINTS - 1))


def breaks(length, levels, longest, both):
    """ends of the panels from 0 to length, halving towards length (both: and towards 0)"""
    reach = length / 2 if both else length
    e = [0.0, min(length, longest) * 0.5 ** levels]
    while e[-1] < reach:
        e.append(min(2 * e[-1], e[-1] + longest))
    e = np.array(e) * (reach / e[-1])
    return np.concatenate([e, length - e[-2::-1]]) if both else length - e[::-1]


class Surface:
    """the panels of one disc: lower face at `bottom`, upper face at `top`"""

    def __init__(self, radius, bottom, top, levels):
        face = breaks(radius, levels, LONGEST * radius, False)
        start = [(r, bottom) for r in face[:-1]] + [(r, top) for r in face[:-1]]
        end = [(r, bottom) for r in face[1:]] + [(r, top) for r in face[1:]]
        side = breaks(top - bottom, levels, LONGEST * radius, True)
        start += [(radius, bottom + s) for s in side[:-1]]
        end += [(radius, bottom + s) for s in side[1:]]
        self.start, self.end = np.array(start), np.array(end)


class Panels:
    """straight panels from start to end, columns rho and z, with their Gauss points"""

    def __init__(self, surfaces):
        self.start = np.concatenate([s.start for s in surfaces])
        self.end = np.concatenate([s.end for s in surfaces])
        self.length = np.linalg.norm(self.end - self.start, axis=1)
        self.points = self.at(slice(None), NODES).reshape(-1, 2)
        self.ds = np.outer(self.length / 2, WEIGHTS).ravel()
        self.first_of_upper = POINTS * len(surfaces[0].start)

    def at(self, panel, t):
        """points of panels at the parameters t in [-1, 1], shape (..., t, 2)"""
        a, b = self.start[panel][..., None, :], self.end[panel][..., None, :]
        return 0.5 * (a + b) + 0.5 * (b - a) * t[:, None]


def potential(x, y, near=None):
    """at x, of a ring through y, per charge density and length of arc; `near`: |x - y|^2 where that is known better"""
    near = np.sum((x - y) ** 2, axis=-1) if near is None else near
    R2 = near + 4 * x[..., 0] * y[..., 0]
    return y[..., 0] * ellipkm1(near / R2) / (np.pi * np.sqrt(R2))


def upward_field(x, y):
    """the same for the field along z"""
    near = np.sum((x - y) ** 2, axis=-1)
    R2, up = near + 4 * x[..., 0] * y[..., 0], x[..., 1] - y[..., 1]
    return y[..., 0] * up * ellipe(1 - near / R2) / (np.pi * np.sqrt(R2) * near)


def lagrange(t):
    """values (t, POINTS) of the polynomials that are 1 on one Gauss point of the panel"""
    return legvander(t, POINTS - 1) @ TO_LEGENDRE


def own_rule():
    """for each Gauss point: distances, parameters, and weights times polynomials, crowded towards it; panel of length 2"""
    u, w = leggauss(OWN)
    u, w = (u + 1) / 2, w / 2
    for t in NODES:
        far = np.concatenate([-(1 + t) * u ** CROWDING, (1 - t) * u ** CROWDING])
        weight = CROWDING * np.concatenate([(1 + t) * w * u ** (CROWDING - 1), (1 - t) * w * u ** (CROWDING - 1)])
        yield far, t + far, weight[:, None] * lagrange(t + far)


def split_rule(nearest, distance):
    """parameters and weights times polynomials on a panel of length 2, halved until a part is no longer than its distance
    from the point that lies at `distance` from the parameter `nearest`"""
    parts, done = [(-1.0, 1.0)], []
    while parts:
        a, b = parts.pop()
        gap = max(a - nearest, nearest - b, 0.0)
        if b - a <= np.hypot(gap, distance):
            done.append((a, b))
        else:
            parts += [(a, (a + b) / 2), ((a + b) / 2, b)]
    a, b = np.array(done).T
    t = (np.outer((a + b) / 2, np.ones(POINTS)) + np.outer((b - a) / 2, NODES)).ravel()
    return t, np.outer((b - a) / 2, WEIGHTS).ravel()[:, None] * lagrange(t)


def matrix(panels, kernel, rows, columns):
    """kernel integrated over the panels of `columns` at the points `rows`; both ranges of points, columns whole panels"""
    x = panels.points
    with np.errstate(divide="ignore", invalid="ignore"):
        A = kernel(x[rows, None], x[None, columns]) * panels.ds[columns]
    own = list(own_rule())
    for p in range(columns.start // POINTS, columns.stop // POINTS):
        a, b, half = panels.start[p], panels.end[p], panels.length[p] / 2
        along = (x[rows] - (a + b) / 2) @ (b - a) / (2 * half * half)
        nearest = np.clip(along, -1, 1)
        away = np.linalg.norm(x[rows] - panels.at(p, nearest), axis=1) / half
        part = slice(p * POINTS - columns.start, (p + 1) * POINTS - columns.start)
        for i in np.flatnonzero(away < 2):
            k = i + rows.start - p * POINTS
            if 0 <= k < POINTS:
                far, t, L = own[k]
                A[i, part] = half * kernel(x[p * POINTS + k], panels.at(p, t), (half * far) ** 2) @ L
            else:
                t, L = split_rule(nearest[i], away[i])
                A[i, part] = half * kernel(x[i + rows.start], panels.at(p, t)) @ L
    return A


def values(g, levels=LEVELS):
    """the quantities of discs-thick.json"""
    (a1, t1), (a2, t2) = ((g[k]["diameter"] / 2, g[k]["thickness"]) for k in ("lower", "upper"))
    panels = Panels([Surface(a1, -t1, 0.0, levels), Surface(a2, g["gap"], g["gap"] + t2, levels)])
    count, cut = len(panels.points), panels.first_of_upper
    A = matrix(panels, potential, slice(0, count), slice(0, count))
    plates = np.stack([np.arange(count) < cut, np.arange(count) >= cut], -1).astype(float)
    sigma = np.linalg.solve(A, plates)
    charge = (2 * np.pi * panels.points[:, 0] * panels.ds)[:, None] * sigma
    C = plates.T @ charge
    field = matrix(panels, upward_field, slice(cut, count), slice(0, cut))
    forces = charge[cut:].T @ field @ sigma[:cut]                            # [volts above, volts below]
    total = C.sum(axis=0)
    lower = -total[1] / total.sum()
    out = dict(matrix=C)
    for name, volts in (("neutral", np.array([lower, lower + 1])), ("grounded", np.array([0.0, 1.0]))):
        out["capacitance_" + name] = C[1] @ volts
        out["force_" + name] = np.array([0.0, 0.0, volts @ forces @ volts])
    return out


def options(parser):
    parser.add_argument("--levels", type=int, default=LEVELS)


def compute(case, args):
    return values(case["geometry"], args.levels)


if __name__ == "__main__":
    store.run("discs-thick", compute, options)
