"""Recomputes levels.json: the discrete values of the grid family at single levels q, two rectangular plates in free space.

    python discrete_levels.py [PART OF A NAME ...] [--update]

Slow but plain, and written independently of the program: an implementation of the same scheme on the same grid must
reproduce the numbers to solver tolerance. The scheme:

* Grid of level q, a tensor product in reference coordinates in which both plates are axis-parallel: 8q cells along a
  plate and 4q across the gap, power 3 towards both ends; 4q cells through a thick plate, power 2; 5q cells outside,
  offsets 0.2 a t^3 exp(t ln(R / 0.2 a)), R = 20 a, a the largest side; between edges less than a/4 apart 4q cells.
* Nodes X = xi + B (R - I) P: P the nearest point of the upper plate relative to its centre, B rising linearly from 0
  on the lower plate to 1 on the upper one and falling linearly to 0 at the far boundary.
* Energy: every corner of every cell carries an eighth of |det J|, J the three cell edges at that corner, and the
  gradient J^-T (potential differences along them). Far boundary: n . grad phi + (n . r) / r^2 phi = 0, lumped.
* Force and torque: exact derivative of that energy at fixed potentials for a rigid motion B (v + w x P) of the nodes.
* Solver: conjugate gradients; the preconditioner inverts the untilted operator by separation of variables, with the
  plates held at their potentials by the capacitance-matrix method.
"""
import numpy as np
import scipy.linalg as sl
import scipy.sparse as sp

import store

TOLERANCE = 1e-10                                      # of the outer iteration, in the preconditioned residual
INNER_TOLERANCE = 1e-11


# ---- graded axes --------------------------------------------------------------------------------------------
def both_ends(a, b, n, power=3.0):
    s = np.linspace(-1, 1, n + 1)
    return (a + b) / 2 + (b - a) / 2 * np.sign(s) * (1 - (1 - np.abs(s)) ** power)


def one_end(a, b, n, power=3.0):                       # fine at b
    return a + (b - a) * (1 - (1 - np.linspace(0, 1, n + 1)) ** power)


def outward(n, s0, R, power=3.0):
    t = np.linspace(0, 1, n + 1)
    return s0 * t ** power * np.exp(np.log(R / s0) * t)


def lateral_axis(edges, q, size, R, half):
    """edges: the plate-edge coordinates; long segments get 8q cells, segments below a quarter of `size` 4q."""
    e = sorted(set(np.round(edges, 14)))
    if half:
        e = [x for x in e if x > 0]
        x = [one_end(0.0, e[0], 4 * q)]
    else:
        x = [np.array([e[0]])]
    for a, b in zip(e[:-1], e[1:]):
        x.append(both_ends(a, b, 8 * q if b - a > size / 4 else 4 * q)[1:])
    o = outward(5 * q, 0.2 * size, R)[1:]
    x.append(e[-1] + o)
    if not half:
        x.insert(0, e[0] - o[::-1])
    return np.concatenate(x)


# ---- geometry ------------------------------------------------------------------------------------------------
def rotation(theta, roll):
    c, s = np.cos(theta), np.sin(theta)
    Ry = np.array([[c, 0, -s], [0, 1, 0], [s, 0, c]])
    c, s = np.cos(roll), np.sin(roll)
    return np.array([[1, 0, 0], [0, c, -s], [0, s, c]]) @ Ry


class Grid:
    def __init__(g, geometry, q):
        lower, upper = geometry["lower"], geometry["upper"]
        c = dict(a1=lower["length"], b1=lower["width"], t1=lower["thickness"],
                 a2=upper["length"], b2=upper["width"], t2=upper["thickness"], d=geometry["gap"],
                 theta=geometry["tilt_deg"], roll=geometry["roll_deg"], dx=geometry["shift"][0], dy=geometry["shift"][1])
        g.half = c["roll"] == 0 and c["dy"] == 0
        size = max(c["a1"], c["a2"], c["b1"], c["b2"])
        R = 20 * size
        g.x = lateral_axis([-c["a1"] / 2, c["a1"] / 2, c["dx"] - c["a2"] / 2, c["dx"] + c["a2"] / 2], q, size, R, False)
        g.y = lateral_axis([-c["b1"] / 2, c["b1"] / 2, c["dy"] - c["b2"] / 2, c["dy"] + c["b2"] / 2], q, size, R, g.half)
        o = outward(5 * q, 0.2 * size, R)[1:]
        body = lambda t: both_ends(0, t, 4 * q, 2.0) if t > 0 else np.array([0.0])
        lo, gap, up = body(c["t1"]) - c["t1"], both_ends(0, c["d"], 4 * q), c["d"] + body(c["t2"])
        g.z = np.concatenate([lo[0] - o[::-1], lo, gap[1:], up[1:], up[-1] + o])
        k = len(o)
        g.klo = list(range(k, k + len(lo)))
        k += len(lo) - 1 + len(gap) - 1
        g.kup = list(range(k, k + len(up)))
        at = lambda ax, v: int(np.argmin(np.abs(ax - v)))
        ylo = lambda b, y0: 0 if g.half else at(g.y, y0 - b / 2)
        g.lo = (at(g.x, -c["a1"] / 2), at(g.x, c["a1"] / 2), ylo(c["b1"], 0), at(g.y, c["b1"] / 2))
        g.up = (at(g.x, c["dx"] - c["a2"] / 2), at(g.x, c["dx"] + c["a2"] / 2),
                ylo(c["b2"], c["dy"]), at(g.y, c["dy"] + c["b2"] / 2))
        g.shape = (len(g.x), len(g.y), len(g.z))
        z = g.z
        above = np.where(z <= up[-1], 1.0, 1 - (z - up[-1]) / (z[-1] - up[-1]))
        g.B = np.where(z <= 0, 0, np.where(z <= c["d"], z / c["d"], above))
        px = np.clip(g.x, c["dx"] - c["a2"] / 2, c["dx"] + c["a2"] / 2) - c["dx"]
        py = np.clip(g.y, c["dy"] - c["b2"] / 2, c["dy"] + c["b2"] / 2) - c["dy"]
        pz = np.clip(z, c["d"], up[-1]) - c["d"]
        g.P = np.stack(np.meshgrid(px, py, pz, indexing="ij"), -1)          # plate point carried by each node
        g.Rm = rotation(np.radians(c["theta"]), np.radians(c["roll"]))
        ref = np.stack(np.meshgrid(g.x, g.y, z, indexing="ij"), -1)
        g.X = ref + g.B[:, None] * (g.P @ g.Rm.T - g.P)


# ---- the discrete energy: one pass over cell corners -----------------------------------------------------------
def corners(X):
    """for each of the 8 corners of every cell: node indices (corner, neighbours along x, y, z), K = vol G G^T, vol, G"""
    n = [s - 1 for s in X.shape[:3]]
    idx = np.arange(np.prod(X.shape[:3])).reshape(X.shape[:3])
    pick = lambda A, o: A[o[0]:n[0] + o[0], o[1]:n[1] + o[1], o[2]:n[2] + o[2]]
    for o in np.ndindex(2, 2, 2):
        nb = [tuple(1 - v if a == ax else v for a, v in enumerate(o)) for ax in range(3)]
        I = [pick(idx, o)] + [pick(idx, m) for m in nb]
        J = np.stack([pick(X, m) - pick(X, o) for m in nb], -1)
        det = np.linalg.det(J)
        sign = (-1) ** sum(o)
        assert np.all(det * sign > 0), "folded grid: the plates touch"
        yield I, np.abs(det) / 8, np.linalg.inv(J)                         # G[l,k] = d xi_l / d x_k


def assemble(g):
    N = int(np.prod(g.shape))
    r, c, v = [], [], []
    for I, vol, G in corners(g.X):
        K = vol[..., None, None] * np.einsum("...lk,...mk->...lm", G, G)
        for l in range(3):
            for m in range(3):
                k = K[..., l, m].ravel()
                for a, sa in ((I[l + 1], 1), (I[0], -1)):
                    for b, sb in ((I[m + 1], 1), (I[0], -1)):
                        r.append(a.ravel()), c.append(b.ravel()), v.append(k * sa * sb)
    A = sp.coo_matrix((np.concatenate(v), (np.concatenate(r), np.concatenate(c))), shape=(N, N)).tocsr()
    dg, idx = np.zeros(N), np.arange(N).reshape(g.shape)
    faces = [(0, 0), (0, -1), (1, -1), (2, 0), (2, -1)] + ([] if g.half else [(1, 0)])
    for ax, e in faces:                                                     # Robin: n.r/|r|^2 per face, lumped
        P, I = np.take(g.X, e, ax), np.take(idx, e, ax)
        n = np.cross(P[1:, :-1] - P[:-1, :-1], P[:-1, 1:] - P[:-1, :-1])
        m = (P[1:, 1:] + P[1:, :-1] + P[:-1, 1:] + P[:-1, :-1]) / 4
        w = np.abs((n * m).sum(-1)) / (m ** 2).sum(-1) / 4
        for s in ((0, 0), (0, 1), (1, 0), (1, 1)):
            np.add.at(dg, I[s[0]:I.shape[0] - 1 + s[0], s[1]:I.shape[1] - 1 + s[1]].ravel(), w.ravel())
    return A + sp.diags(dg)


# ---- separable preconditioner with the plates held by the capacitance-matrix method --------------------------------
def stiff(h):
    D = np.zeros((len(h) + 1,) * 2)
    i = np.arange(len(h))
    D[i, i] += 1 / h; D[i + 1, i + 1] += 1 / h; D[i, i + 1] -= 1 / h; D[i + 1, i] -= 1 / h
    return D


def mass(h):
    m = np.zeros(len(h) + 1)
    m[:-1] += h / 2; m[1:] += h / 2
    return m


class Separable:
    def __init__(s, g):
        R = g.z[-1]
        hx, hy, hz = np.diff(g.x), np.diff(g.y), np.diff(g.z)
        Dx, Dy, Dz = stiff(hx), stiff(hy), stiff(hz)
        Dx[0, 0] += 1 / R; Dx[-1, -1] += 1 / R; Dy[-1, -1] += 1 / R; Dz[0, 0] += 1 / R; Dz[-1, -1] += 1 / R
        if not g.half:
            Dy[0, 0] += 1 / R
        s.mx, s.my, s.mz = mass(hx), mass(hy), mass(hz)
        lx, s.Qx = sl.eigh(Dx, np.diag(s.mx))
        ly, s.Qy = sl.eigh(Dy, np.diag(s.my))
        lam = lx[:, None] + ly[None, :]
        nz = len(g.z)
        s.o = np.diag(Dz, 1)
        s.b, s.c = np.empty(lam.shape + (nz,)), np.zeros(lam.shape + (nz,))
        s.b[..., 0] = Dz[0, 0] + lam * s.mz[0]
        for k in range(1, nz):
            s.c[..., k - 1] = s.o[k - 1] / s.b[..., k - 1]
            s.b[..., k] = Dz[k, k] + lam * s.mz[k] - s.o[k - 1] * s.c[..., k - 1]
        s.planes = g.klo + g.kup
        s.mask = np.zeros((len(g.x), len(g.y), len(s.planes)), bool)
        i0, i1, j0, j1 = g.lo; s.mask[i0:i1 + 1, j0:j1 + 1, :len(g.klo)] = True
        i0, i1, j0, j1 = g.up; s.mask[i0:i1 + 1, j0:j1 + 1, len(g.klo):] = True
        s.G = np.empty(lam.shape + (len(s.planes),) * 2)
        for p, k in enumerate(s.planes):
            r = np.zeros(lam.shape + (nz,)); r[..., k] = 1
            s.G[..., p] = s.tri(r)[..., s.planes]
        # inner preconditioner: (plate box operator, natural sides) + (outside and gap, planar)
        nl = len(g.klo)
        thick = [nl > 1, len(g.kup) > 1]
        s.faces = sorted({0, nl - 1, nl, len(s.planes) - 1})
        N = np.linalg.inv(s.G[:, :, s.faces][:, :, :, s.faces])
        s.boxes = []
        for body, (zs, off, box, tk) in enumerate(((g.z[g.klo], 0, g.lo, thick[0]), (g.z[g.kup], nl, g.up, thick[1]))):
            if not tk:
                continue
            n = len(zs)
            f = [s.faces.index(off), s.faces.index(off + n - 1)]
            D, m = stiff(np.diff(zs)), mass(np.diff(zs))
            K = D + lam[..., None, None] * np.diag(m)
            e, i = [0, n - 1], list(range(1, n - 1))
            S = K[..., e, :][..., e] - K[..., e, :][..., i] @ np.linalg.solve(K[..., i, :][..., i], K[..., i, :][..., e])
            for a in range(2):
                for b in range(2):
                    N[..., f[a], f[b]] -= S[..., a, b]
            i0, i1, j0, j1 = box
            s.boxes.append((slice(i0, i1 + 1), slice(j0, j1 + 1), slice(off, off + n), stiff(hx[i0:i1]),
                            mass(hx[i0:i1]), stiff(hy[j0:j1]), mass(hy[j0:j1]), D, m))
        s.Nf = N

    def tri(s, r):
        u = r.copy()
        u[..., 0] /= s.b[..., 0]
        for k in range(1, r.shape[2]):
            u[..., k] = (u[..., k] - s.o[k - 1] * u[..., k - 1]) / s.b[..., k]
        for k in range(r.shape[2] - 2, -1, -1):
            u[..., k] -= s.c[..., k] * u[..., k + 1]
        return u

    def fwd(s, r):
        return np.einsum("jb,ajk->abk", s.Qy, np.einsum("ia,ijk->ajk", s.Qx, r, optimize=True), optimize=True)

    def bwd(s, r):
        return np.einsum("ia,ajk->ijk", s.Qx, np.einsum("jb,abk->ajk", s.Qy, r, optimize=True), optimize=True)

    def S(s, q):
        return s.bwd(np.einsum("abpq,abq->abp", s.G, s.fwd(q * s.mask))) * s.mask

    def N(s, v):
        v = v * s.mask
        w = np.zeros_like(v)
        m = s.mx[:, None, None] * s.my[None, :, None]
        w[:, :, s.faces] = m * s.bwd(np.einsum("abpq,abq->abp", s.Nf, s.fwd(m * v[:, :, s.faces])))
        for ix, iy, ik, Dx, mx, Dy, my, Dz, mz in s.boxes:
            u = v[ix, iy, ik]
            w[ix, iy, ik] += (np.einsum("ij,jkl->ikl", Dx, u) * my[:, None] * mz
                              + np.einsum("ij,kjl->kil", Dy, u) * mx[:, None, None] * mz
                              + np.einsum("ij,klj->kli", Dz, u) * mx[:, None, None] * my[:, None])
        return w * s.mask

    def apply(s, r):
        """A0^-1 on the free nodes: one forward transform, one inner solve on the plates, one backward transform"""
        h = s.fwd(r)
        u = s.tri(h)
        lam = cg(s.S, s.bwd(u[..., s.planes]) * s.mask, s.N, INNER_TOLERANCE)
        f = np.zeros_like(h)
        f[..., s.planes] = s.fwd(lam)
        return s.bwd(u - s.tri(f))


def cg(A, b, M, tol, most=400):
    x, r = np.zeros_like(b), b.copy()
    z = M(r); p = z.copy(); rz = rz0 = (r * z).sum()
    for n in range(1, most + 1):
        if rz0 == 0:
            return x
        Ap = A(p)
        a = rz / (p * Ap).sum()
        x += a * p; r -= a * Ap
        z = M(r); new = (r * z).sum()
        if abs(new) < tol ** 2 * rz0:
            return x
        p = z + new / rz * p; rz = new
    raise RuntimeError("not converged")


# ---- one level ----------------------------------------------------------------------------------------------------
def solve(geometry, q):
    """-> the quantities of levels.json, number of nodes"""
    g = Grid(geometry, q)
    A, s = assemble(g), Separable(g)
    free = np.ones(g.shape, bool)
    fix = [np.zeros(g.shape), np.zeros(g.shape)]
    for f, (i0, i1, j0, j1), ks in ((fix[0], g.lo, g.klo), (fix[1], g.up, g.kup)):
        f[i0:i1 + 1, j0:j1 + 1, ks] = 1
        free[i0:i1 + 1, j0:j1 + 1, ks] = False
    op = lambda v: np.where(free, (A @ v.ravel()).reshape(g.shape), 0.0)
    phi = []
    for f in fix:
        u = cg(op, -op(f), lambda r: np.where(free, s.apply(r), 0.0), TOLERANCE)
        phi.append((f + u).ravel())
    F = np.stack(phi, 1)
    C = F.T @ (A @ F) * (2 if g.half else 1)
    col = C.sum(0)
    vl = -col[1] / col.sum()
    C[0, 1] = C[1, 0] = (C[0, 1] + C[1, 0]) / 2
    out = dict(matrix=C, capacitance_neutral=(C @ [vl, 1 + vl])[1])
    rel = g.P @ g.Rm.T
    axes = np.eye(3)
    virtual = [np.broadcast_to(e, rel.shape) for e in axes] + [np.cross(np.broadcast_to(e, rel.shape), rel) for e in axes]
    odd = (1, 3, 5) if g.half else ()                                       # Fy, Tx, Tz vanish by symmetry
    geo = list(corners(g.X))
    for mode, V in (("neutral", (vl, 1 + vl)), ("grounded", (0.0, 1.0))):
        f, w = F @ np.array(V), np.zeros(6)
        for k, v in enumerate(virtual):
            if k in odd:
                continue
            u = (g.B[:, None] * v).reshape(-1, 3)
            for I, vol, G in geo:
                grad = np.einsum("...lk,...l->...k", G, np.stack([f[I[l + 1]] - f[I[0]] for l in range(3)], -1))
                dv = np.einsum("...lk,...lc->...ck", G, np.stack([u[I[l + 1]] - u[I[0]] for l in range(3)], -2))
                w[k] += (vol * ((grad ** 2).sum(-1) * np.einsum("...cc->...", dv) / 2
                                - np.einsum("...k,...ck,...c->...", grad, dv, grad))).sum()
        w *= 2 if g.half else 1
        out["force_" + mode], out["torque_" + mode] = w[:3], w[3:]
    return out, int(np.prod(g.shape))


def compute(case, args):
    value, nodes = solve(case["geometry"], case["level"])
    assert nodes == case["nodes"], (nodes, case["nodes"])
    for key in value:
        value[key] = np.where(np.array(case["uncertainty"][key]) == 0, 0.0, value[key])      # zero by symmetry
    return value


store.run("levels", compute)
