"""Boundary elements for conductors made of flat rectangular faces, in free space; eps0 = 1.

The charge is constant on rectangular panels graded towards the edges; potentials are collocated at the panel centres;
potential and field of a uniformly charged rectangle are closed forms. A problem that is symmetric in y is solved on
y >= 0 with mirror images. Forces come from the field of the lower conductor on the panels of the upper one.
Memory and time grow as n^4 and n^6 with the number n of panels along an edge; n = 64 needs about 1 GB.
"""
import numpy as np
import scipy.linalg as sl


def rotation(tilt, roll):
    """R = Rx(roll) Ry(tilt), radians: tilt > 0 raises the +x edge, roll > 0 the +y edge"""
    c, s = np.cos(tilt), np.sin(tilt)
    about_y = np.array([[c, 0, -s], [0, 1, 0], [s, 0, c]])
    c, s = np.cos(roll), np.sin(roll)
    return np.array([[1, 0, 0], [0, c, -s], [0, s, c]]) @ about_y


def rectangle_potential_field(x1, x2, y1, y2, px, py, pz):
    """integral of 1/r over rectangles in z = 0, and minus its gradient (without 1 / 4 pi eps0), at points (px, py, pz)"""
    shape = np.broadcast(px, x1).shape
    phi, ex, ey, ez = (np.zeros(shape) for _ in range(4))
    az = np.abs(pz)
    for sx, X in ((1, x2), (-1, x1)):
        for sy, Y in ((1, y2), (-1, y1)):
            s = sx * sy
            u, v = X - px, Y - py
            r = np.sqrt(u * u + v * v + pz * pz)
            lu = np.arcsinh(u / np.sqrt(v * v + pz * pz + 1e-300))
            lv = np.arcsinh(v / np.sqrt(u * u + pz * pz + 1e-300))
            at = np.arctan2(u * v, az * r + 1e-300)
            phi += s * (v * lu + u * lv - az * at)
            ex += s * lv
            ey += s * lu
            ez += s * np.sign(pz) * at
    return phi, ex, ey, ez


def graded(n, power, both_ends):
    """n + 1 panel boundaries on [0, 1], graded towards both ends or towards 1"""
    t = np.linspace(0, 1, n + 1)
    if both_ends:
        s = 2 * t - 1
        return (np.sign(s) * (1 - (1 - np.abs(s)) ** power) + 1) / 2
    return 1 - (1 - t) ** power


class Face:
    """rectangle corner + [0,1] u + [0,1] v, cut into nu x nv panels, belonging to plate `body`"""

    def __init__(self, corner, u, v, nu, nv, body, power, v_both=True):
        u, v = np.asarray(u, float), np.asarray(v, float)
        lu, lv = np.linalg.norm(u), np.linalg.norm(v)
        self.corner, self.body = np.asarray(corner, float), body
        self.R = np.stack([u / lu, v / lv, np.cross(u / lu, v / lv)], 1)
        a, b = graded(nu, power, True) * lu, graded(nv, power, v_both) * lv
        X1, Y1 = np.meshgrid(a[:-1], b[:-1], indexing="ij")
        X2, Y2 = np.meshgrid(a[1:], b[1:], indexing="ij")
        self.p = [q.ravel() for q in (X1, X2, Y1, Y2)]
        p = self.p
        self.centre = np.stack([(p[0] + p[1]) / 2, (p[2] + p[3]) / 2, 0 * p[0]], 1) @ self.R.T + self.corner
        self.area = (p[1] - p[0]) * (p[3] - p[2])

    def field(self, points, mirror):
        """potential (point, panel) and field (3, point, panel) of unit charge density, with the image in y = 0"""
        def at(points):
            t = (points - self.corner) @ self.R
            f = rectangle_potential_field(*[q[None] for q in self.p], t[:, :1], t[:, 1:2], t[:, 2:])
            return f[0], np.einsum("ij,jab->iab", self.R, np.stack(f[1:]))
        phi, E = at(points)
        if mirror:
            m = np.array([1.0, -1.0, 1.0])
            phi2, E2 = at(points * m)
            phi, E = phi + phi2, E + m[:, None, None] * E2
        return phi / (4 * np.pi), E / (4 * np.pi)


def plate(size, centre, tilt, roll, n, m, body, up, symmetric, power):
    """Faces of a plate whose FACING surface is centred at `centre`; the thickness grows away from the gap, upwards if
    `up`. n panels along length and width, m through the thickness; thickness 0 is one sheet."""
    a, b, t = size["length"], size["width"], size["thickness"]
    R, c = rotation(tilt, roll), np.asarray(centre, float)
    s = 1.0 if up else -1.0
    y0, ny, both = (0.0, n // 2, False) if symmetric else (-b / 2, n, True)
    direction = lambda x, y, z: R @ np.array([x, y, z])
    point = lambda x, y, z: direction(x, y, z) + c
    L = b / 2 - y0
    lengthwise, widthwise, through = direction(a, 0, 0), direction(0, L, 0), direction(0, 0, s * t)
    faces = [Face(point(-a / 2, y0, 0), lengthwise, widthwise, n, ny, body, power, both)]
    if t > 0:
        faces.append(Face(point(-a / 2, y0, s * t), lengthwise, widthwise, n, ny, body, power, both))
        for x in (-a / 2, a / 2):
            faces.append(Face(point(x, y0, 0), through, widthwise, m, ny, body, power, both))
        for y in (b / 2,) if symmetric else (-b / 2, b / 2):
            faces.append(Face(point(-a / 2, y, 0), lengthwise, through, n, m, body, power))
    return faces


def solve(faces, symmetric, centre, chunk=512):
    """-> Maxwell matrix (2 x 2) and a function (V_lower, V_upper) -> force, torque about `centre` on the upper plate"""
    count = [len(f.centre) for f in faces]
    first = np.concatenate([[0], np.cumsum(count)])
    N = first[-1]
    points = np.vstack([f.centre for f in faces])
    area = np.concatenate([f.area for f in faces]) * (2 if symmetric else 1)
    body = np.concatenate([[f.body] * k for f, k in zip(faces, count)])
    upper, lower = np.where(body == 1)[0], np.where(body == 0)[0]
    P = np.empty((N, N))
    E = np.zeros((3, len(upper), N), dtype=np.float32 if N > 9000 else float)
    place = -np.ones(N, int)
    place[upper] = np.arange(len(upper))
    for j, f in enumerate(faces):
        for i in range(0, N, chunk):
            phi, e = f.field(points[i:i + chunk], symmetric)
            P[i:i + chunk, first[j]:first[j + 1]] = phi
            if f.body == 0:
                rows = place[i:min(i + chunk, N)]
                E[:, rows[rows >= 0], first[j]:first[j + 1]] = e[:, rows >= 0]
    unit = (body[:, None] == np.arange(2)[None]).astype(float)
    density = sl.solve(P, unit, overwrite_a=True, check_finite=False)
    charge = density * area[:, None]
    C = np.array([[charge[body == i, j].sum() for j in range(2)] for i in range(2)])

    def wrench(potentials):
        s = density @ np.asarray(potentials, float)
        f = np.stack([E[k][:, lower] @ s[lower] for k in range(3)], 1) * (s * area)[upper, None]
        torque = np.cross(points[upper] - np.asarray(centre), f)
        if symmetric:
            f[:, 1] = 0
            torque[:, [0, 2]] = 0
        return f.sum(0), torque.sum(0)

    return C, wrench


def two_plates(geometry, n, power, m=None):
    """the quantities of plates.json with n panels along each edge, m through the thickness"""
    g = geometry
    symmetric = g["roll_deg"] == 0 and g["shift"][1] == 0
    m = m or max(4, n // 4)
    centre = (*g["shift"], g["gap"])
    faces = plate(g["lower"], (0, 0, 0), 0, 0, n, m, 0, False, symmetric, power)
    faces += plate(g["upper"], centre, np.radians(g["tilt_deg"]), np.radians(g["roll_deg"]), n, m, 1, True, symmetric, power)
    C, wrench = solve(faces, symmetric, centre)
    C[0, 1] = C[1, 0] = (C[0, 1] + C[1, 0]) / 2
    column = C.sum(0)
    lower = -column[1] / column.sum()                        # potential of the lower plate at total charge zero
    out = dict(matrix=C, capacitance_neutral=(C @ [lower, 1 + lower])[1])
    for mode, V in (("neutral", (lower, 1 + lower)), ("grounded", (0.0, 1.0))):
        out["force_" + mode], out["torque_" + mode] = wrench(V)
    return out


def fit(values, ns, orders):
    """a of a + b n^-orders[0] + c n^-orders[1] through three values (numbers or arrays)"""
    A = np.array([[1.0] + [float(n) ** -p for p in orders] for n in ns])
    return np.tensordot(np.linalg.inv(A)[0], np.array(values), 1)


def reference(geometry, ns, power=3.0):
    """-> values, spread: mean and range of four extrapolations, two gradings times two fits"""
    fits = {}
    for p in (power, power + 1):
        runs = [two_plates(geometry, n, p) for n in ns]
        for key in runs[0]:
            fits.setdefault(key, []).extend(fit([r[key] for r in runs], ns, o) for o in ((2, 3), (2, 4)))
    return {k: np.mean(v, axis=0) for k, v in fits.items()}, {k: np.ptp(v, axis=0) for k, v in fits.items()}
