"""Recomputes discs-tilted.json: two thin discs in free space, tilted, rolled, shifted, unequal, by harmonics of the discs.

The potential of each disc is a sum of the spheroidal harmonics of spheroid.py, l <= L, m <= M (for coaxial discs that goes
back to [Nicholson1924]). On its own disc that sum is
diagonal; on the other one it is projected onto that disc's functions by Gauss points in eta and equal steps in phi, whose
weights are those of the energy, so that this is Galerkin's method for the charge: the capacitance matrix converges with
the square of the error of the charge. Force and torque on the upper disc are the integral of its charge in the field of
the lower one, which is the exact derivative of the discrete energy.

A disc is a body of revolution: all that counts is its centre and its normal. If the shift is along the horizontal part of
the normal (or one of them is 0), the plane through them and z is one of symmetry, and half of the functions vanish.

    python discs_tilted.py [PART OF A NAME ...] [--order L M] [--check] [--update]

--order: other numbers of harmonics than those stored with the case. --check: the potential at other points of both discs,
force and torque against difference quotients of the energy, action against reaction, and the lower disc seen from the
upper one. A case takes up to twenty seconds, --check some forty times that.
"""
import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
from numpy.polynomial.legendre import leggauss
from scipy.linalg import cho_factor, cho_solve

import spheroid
import store

SPARE = 1.5                                              # points for the products of harmonics and potential
BLOCK = 6000                                             # points handled at a time
STEP = 0.02                                              # of a difference quotient, in near gaps: error about STEP^6


def rotation(tilt, roll):
    """R = Rx(roll) Ry(tilt)"""
    ct, st, cr, sr = np.cos(tilt), np.sin(tilt), np.cos(roll), np.sin(roll)
    return np.array([[1, 0, 0], [0, cr, -sr], [0, sr, cr]]) @ np.array([[ct, 0, -st], [0, 1, 0], [st, 0, ct]])


def turned(angle):
    """rotation about z"""
    c, s = np.cos(angle), np.sin(angle)
    return np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]])


class Disc:
    """a disc with its functions up to (L, M) and its points; axes: columns are the directions of its frame in space"""

    def __init__(self, radius, centre, axes, order, symmetric):
        self.radius, self.centre, self.axes = radius, np.asarray(centre, float), axes
        self.top, last = order
        self.modes = [(m, p) for m in range(last + 1) for p in ((0,) if symmetric or m == 0 else (0, 1))]
        self.lengths = [len(spheroid.degrees(m, self.top)) for m, _ in self.modes]
        self.start = np.concatenate([[0], np.cumsum(self.lengths)])
        self.root = np.sqrt(2 * radius * np.concatenate([spheroid.strength(m, self.top) for m, _ in self.modes]))
        x, w = leggauss(2 * int(np.ceil(SPARE * self.top / 2 + 8)))
        self.eta, self.weight = x[x > 0], w[x > 0]
        steps = int(np.ceil(SPARE * last + 8)) * (1 if symmetric else 2)
        self.phi = (np.arange(steps) + 0.5) * (np.pi if symmetric else 2 * np.pi) / steps
        self.step = 2 * np.pi / steps
        rho = radius * np.sqrt((1 - self.eta) * (1 + self.eta))[:, None]
        own = np.stack([rho * np.cos(self.phi), rho * np.sin(self.phi), 0 * rho * self.phi], -1)
        self.points = self.centre + own @ axes.T                             # (eta, phi, 3)

    def local(self, points):
        return (points - self.centre) @ self.axes

    def unit(self):
        """the potential 1 in functions times root"""
        b = np.zeros(self.start[-1])
        b[0] = self.root[0] * np.sqrt(2 * np.pi)
        return b

    def split(self, w):
        """weights times root -> weights of the potential, mode by mode"""
        return np.split(w / self.root, self.start[1:-1])

    def projector(self):
        """mode by mode: angular factors (phi) and polynomials (degrees, eta), with the weights of the points"""
        for m, parity in self.modes:
            P, _ = spheroid.legendre(m, self.top, self.eta)
            yield spheroid.angular(m, parity, self.phi)[0] * self.step, np.sqrt(2) * P * self.weight

    def charge(self, w):
        """charge at the points, for weights times root"""
        density = 0
        for (m, parity), v in zip(self.modes, self.split(w)):
            P, _ = spheroid.legendre(m, self.top, self.eta)
            radial = np.sqrt(2) * (v * spheroid.strength(m, self.top)) @ P
            density = density + np.outer(radial, spheroid.angular(m, parity, self.phi)[0])
        return 2 * self.radius * density * self.weight[:, None] * self.step

    def potential(self, points, w):
        """potential of this disc at points (n, 3) off it"""
        xi, eta, phi = spheroid.spheroidal(self.radius, self.local(points))
        total = 0
        for (m, parity), v in zip(self.modes, self.split(w)):
            P, T = spheroid.legendre(m, self.top, eta)[0], spheroid.decay(m, self.top, xi)[0]
            total = total + np.sqrt(2) * spheroid.angular(m, parity, phi)[0] * np.einsum("l,lp,lp->p", v, T, P)
        return total

    def field(self, points, w):
        """field of this disc at points"""
        g = spheroid.gradient(self.radius, self.local(points), self.modes, self.top, self.split(w))
        return -g @ self.axes.T


def coupling(source, target):
    """potential of the functions of `source`, projected onto those of `target`; both with the factor root"""
    angles, polynomials = zip(*target.projector())
    angles, K = np.array(angles), np.zeros((target.start[-1], source.start[-1]))
    rows = max(1, BLOCK // len(target.phi))
    for first in range(0, len(target.eta), rows):
        part = slice(first, first + rows)
        points = source.local(target.points[part])
        shape = points.shape[:2]
        xi, eta, phi = spheroid.spheroidal(source.radius, points.reshape(-1, 3))
        known = None
        for (m, parity), column in zip(source.modes, source.start):
            if known is None or known[0] != m:
                known = m, np.sqrt(2) * spheroid.legendre(m, source.top, eta)[0] * spheroid.decay(m, source.top, xi)[0]
            potential = known[1] * spheroid.angular(m, parity, phi)[0]
            waves = potential.reshape((-1,) + shape) @ angles.T              # (degrees, eta, modes of the target)
            columns = slice(column, column + len(waves))
            for k, P in enumerate(polynomials):
                K[target.start[k]:target.start[k + 1], columns] += P[:, part] @ waves[:, :, k].T
    return target.root[:, None] * K / source.root


class Pair:
    """lower disc of radius a1 in z = 0, upper one of radius a2 with centre (shift, gap) and axes R, solved at 1 V each"""

    def __init__(self, a1, a2, shift, gap, R, order, turn=0.0, symmetric=False):
        frame = turned(turn)                                                 # x axis in the plane of symmetry
        normal = R[:, 2]
        across = np.cross(normal, frame[:, 0])
        across /= np.linalg.norm(across)
        tilted = np.stack([np.cross(across, normal), across, normal], -1)
        self.lower = Disc(a1, (0, 0, 0), frame, order, symmetric)
        self.upper = Disc(a2, (shift[0], shift[1], gap), tilted, order, symmetric)
        self.frame, self.symmetric = frame, symmetric
        A = coupling(self.lower, self.upper)
        b1, b2 = self.lower.unit(), self.upper.unit()
        factor = cho_factor(np.eye(len(A)) - A @ A.T, lower=True)
        right = np.stack([-A @ b1, b2], -1)                                  # 1 V on the lower, on the upper disc
        self.w2 = cho_solve(factor, right)
        self.w1 = np.stack([b1, 0 * b1], -1) - A.T @ self.w2
        self.A, self.matrix = A, np.stack([b1 @ self.w1, b2 @ self.w2])

    def wirings(self):
        """-> name and the potentials of the two discs"""
        total = self.matrix.sum(axis=0)                                      # charge for 1 V on one of them
        lower = -total[1] / total.sum()
        yield "neutral", np.array([lower, lower + 1])
        yield "grounded", np.array([0.0, 1.0])

    def wrench(self, volts, on_lower=False):
        """-> force on the upper disc, torque about its centre; on_lower: both from the charge of the lower disc"""
        w1, w2 = self.w1 @ volts, self.w2 @ volts
        there, here = (self.upper, self.lower) if on_lower else (self.lower, self.upper)
        w_there, w_here = (w2, w1) if on_lower else (w1, w2)
        load = here.charge(w_here)[..., None] * there.field(here.points, w_there)
        moment = np.cross(here.points - self.upper.centre, load)
        force, torque = load.sum(axis=(0, 1)), moment.sum(axis=(0, 1))
        if self.symmetric:                                                   # points on one side of the plane only
            across = self.frame[:, 1]
            force, torque = force - across * (across @ force), across * (across @ torque)
        return (-force, -torque) if on_lower else (force, torque)

    def values(self):
        out = dict(matrix=self.matrix)
        for name, volts in self.wirings():
            out["capacitance_" + name] = self.matrix[1] @ volts
            out["force_" + name], out["torque_" + name] = self.wrench(volts)
        return out


def solve(g, order, symmetric=None):
    """the pair of a geometry as in discs-tilted.json"""
    a1, a2, shift = g["lower"]["diameter"] / 2, g["upper"]["diameter"] / 2, np.array(g["shift"])
    R = rotation(np.radians(g["tilt_deg"]), np.radians(g["roll_deg"]))
    lean = R[:2, 2]
    if symmetric is None:
        symmetric = lean[0] * shift[1] == lean[1] * shift[0]
    direction = shift if np.any(shift) else lean
    turn = np.arctan2(direction[1], direction[0]) if symmetric and np.any(direction) else 0.0
    return Pair(a1, a2, shift, g["gap"], R, order, turn, symmetric)


def compute(case, args):
    order = args.order or case["order"]
    value = solve(case["geometry"], order).values()
    if args.check:
        check(case["geometry"], order, value)
    zero = {k: np.array(u) == 0 for k, u in case["uncertainty"].items()}
    return {k: np.where(zero[k], 0.0, v) for k, v in value.items()}          # zero by symmetry


def potential_error(pair, volts):
    """largest |potential - volts| at points of both discs that are not those of the projection"""
    rng, worst = np.random.default_rng(1), 0.0
    for here, there, w_here, w_there, v in ((pair.lower, pair.upper, pair.w1, pair.w2, volts[0]),
                                            (pair.upper, pair.lower, pair.w2, pair.w1, volts[1])):
        phi, eta = 2 * np.pi * rng.random(300), rng.random(300)
        rho = here.radius * np.sqrt(1 - eta ** 2)
        own = np.stack([rho * np.cos(phi), rho * np.sin(phi), 0 * phi], -1)
        total = there.potential(here.centre + own @ here.axes.T, w_there @ volts)
        for (m, parity), weights in zip(here.modes, here.split(w_here @ volts)):
            total += np.sqrt(2) * spheroid.angular(m, parity, phi)[0] * (weights @ spheroid.legendre(m, here.top, eta)[0])
        worst = max(worst, np.max(np.abs(total - v)))
    return worst


def quotients(g, order, volts):
    """force and torque on the upper disc from six-point difference quotients of the energy at these potentials"""
    a1, a2 = g["lower"]["diameter"] / 2, g["upper"]["diameter"] / 2
    centre = np.array([*g["shift"], g["gap"]])
    R = rotation(np.radians(g["tilt_deg"]), np.radians(g["roll_deg"]))

    def energy(move, turn):
        angle = np.linalg.norm(turn)
        n = turn / (angle or 1.0)
        N = np.array([[0, -n[2], n[1]], [n[2], 0, -n[0]], [-n[1], n[0], 0]])
        c = centre + move
        pair = Pair(a1, a2, c[:2], c[2], (np.eye(3) + np.sin(angle) * N + (1 - np.cos(angle)) * N @ N) @ R, order)
        return 0.5 * volts @ pair.matrix @ volts
    near, none = STEP * near_gap(g), np.zeros(3)

    def slope(along, step):
        values = [energy(*along(k * step)) - energy(*along(-k * step)) for k in (1, 2, 3)]
        return np.dot((45, -9, 1), values) / (60 * step)
    axes = np.eye(3)
    return (np.array([slope(lambda h, e=e: (h * e, none), near) for e in axes]),
            np.array([slope(lambda h, e=e: (none, h * e), near / a2) for e in axes]))


def near_gap(g):
    """height of the lowest point of the upper rim"""
    R = rotation(np.radians(g["tilt_deg"]), np.radians(g["roll_deg"]))
    return g["gap"] - g["upper"]["diameter"] / 2 * np.hypot(*R[:2, 2])


def check(g, order, value):
    """prints how far other routes are from `value`, relative to the largest charge or the largest force"""
    far = lambda new, old, scale: float(np.max(np.abs(np.subtract(new, old))) / np.max(np.abs(scale)))
    pair = solve(g, order)
    errors = "  ".join(f"{name} {potential_error(pair, volts):.1e}" for name, volts in pair.wirings())
    print("  potential on the discs     " + errors)
    for name, volts in pair.wirings():
        force, torque = value["force_" + name], value["torque_" + name]
        reaction, quotient = pair.wrench(volts, on_lower=True), quotients(g, order, volts)
        for text, (f, t) in (("reaction on the lower disc", reaction), ("difference quotient       ", quotient)):
            print(f"  {text} {name}: force {far(f, force, force):.1e}, "
                  f"torque {far(t, torque, force):.1e}")
    R = rotation(np.radians(g["tilt_deg"]), np.radians(g["roll_deg"]))
    lower_centre = -R.T @ np.array([*g["shift"], g["gap"]])
    seen = Pair(g["upper"]["diameter"] / 2, g["lower"]["diameter"] / 2, lower_centre[:2], lower_centre[2], R.T, order)
    force, _ = seen.wrench(np.array([1.0, 0.0]))
    matrix, old = value["matrix"], value["force_grounded"]
    print(f"  seen from the upper disc   matrix {far(seen.matrix[::-1, ::-1], matrix, matrix):.1e}, "
          f"force grounded {far(-R @ force, old, old):.1e}")


def options(parser):
    parser.add_argument("--order", nargs=2, type=int, metavar=("L", "M"))
    parser.add_argument("--check", action="store_true")


if __name__ == "__main__":
    store.run("discs-tilted", compute, options)
