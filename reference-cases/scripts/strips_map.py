"""Exact conformal map of a ring onto the outside of two arbitrary straight slits, by theta functions (mpmath).

Ring 0 < Im w < h, w ~ w + 1; the slits are the images of its two boundary lines, C/eps0 = 1/h.

* tilted by theta: origin at the apex, where the two lines meet. f(w + 1) = f(w), f(w + 2ih) = e^{2 i theta} f(w), one
  simple pole (infinity) at w = ib and its mirror image, hence
  f(w) = A F(w - ib) + conj(A) F(w + ib),  F(z) = theta1'(0) theta1(z + al) / (theta1(z) theta1(al)),  tau = 2ih,
  al = -theta/pi
* parallel: f(w) = A Z(w - ib) + conj(A) Z(w + ib) + c,  Z = theta1'/theta1,  Re A = -d/(2 pi)

The four slit ends are the critical values of f on the boundary lines: four real equations for (h, b, A) or
(h, b, c, Im A), solved by Newton's method. Theta functions are summed at the dual nome exp(-pi/2h). The derivatives of C
follow from the same Jacobian.
"""
import mpmath as mm
from mpmath import mp, mpc, mpf


def theta1(z, log_nome, derivatives=1):
    """theta_1 with theta_1(z + 1) = -theta_1(z), and derivatives, summed from the largest term outwards"""
    z = mpc(z)
    n0 = int(mm.nint(mp.pi * z.imag / log_nome - mpf(1) / 2))
    i_pi = mpc(0, 1) * mp.pi
    total = [mpc(0)] * (derivatives + 1)

    def add(n):
        t = (-1) ** (n % 2) * mp.exp(log_nome * (n + mpf(1) / 2) ** 2 + i_pi * (2 * n + 1) * z)
        for j in range(derivatives + 1):
            total[j] += t * (i_pi * (2 * n + 1)) ** j
        return abs(t) * (abs(2 * n + 1) + 1) ** derivatives
    small = add(n0) * mp.eps * mpf(2) ** -12
    for sign in (1, -1):
        n = n0 + sign
        while add(n) > small:
            n += sign
    return [q / mpc(0, 1) for q in total]


class SlitMap:
    """f for given h, b, A, tilt theta and, if parallel, the shift c; side 0: lower slit, 1: upper slit"""

    def __init__(self, h, b, A_re, A_im, theta, c=0):
        self.h, self.b, self.A, self.theta, self.c = mpf(h), mpf(b), mpc(A_re, A_im), mpf(theta), mpf(c)
        self.tau = 2 * self.h * mpc(0, 1)
        self.log_nome = -mp.pi / (2 * self.h)            # of the dual modulus -1/tau
        self.slope0 = theta1(0, self.log_nome)[1]
        if self.theta != 0:
            self.al = -self.theta / mp.pi
            self.at_al = theta1(self.al / self.tau, self.log_nome)[0]

    def F(self, z):
        """F or Z, and its derivative"""
        z = mpc(z)
        z = z - mm.nint(z.real)
        x = z / self.tau
        if self.theta == 0:
            t, d1, d2 = theta1(x, self.log_nome, 2)
            L = d1 / t
            return -2j * mp.pi * z / self.tau + L / self.tau, -2j * mp.pi / self.tau + (d2 / t - L * L) / self.tau ** 2
        a = self.al / self.tau
        t, dt = theta1(x, self.log_nome)
        u, du = theta1(x + a, self.log_nome)
        v = mp.exp(-2j * mp.pi * z * a) * self.slope0 * u / (t * self.at_al) / self.tau
        return v, v * (-2j * mp.pi * a + (du / u - dt / t) / self.tau)

    def f(self, w):
        w, Ac = mpc(w), mm.conj(self.A)
        p, dp = self.F(w - mpc(0, self.b))
        q, dq = self.F(w + mpc(0, self.b))
        return self.A * p + Ac * q + self.c, self.A * dp + Ac * dq

    def partials(self, w):
        """of f with respect to b, Re A, Im A at fixed w"""
        w, Ac = mpc(w), mm.conj(self.A)
        p, dp = self.F(w - mpc(0, self.b))
        q, dq = self.F(w + mpc(0, self.b))
        return -1j * self.A * dp + 1j * Ac * dq, p + q, 1j * (p - q)

    def boundary(self, x, side):
        """signed coordinate along the line of the slit, and its derivative with respect to x"""
        v, d = self.f(mpc(x, self.h if side else 0))
        if side and self.theta != 0:
            e = mp.exp(-1j * self.theta)
            v, d = v * e, d * e
        return v.real, d.real

    def tips(self, side):
        """the two x whose images are the ends of the slit"""
        with mp.workdps(20):
            x = min(self.h, self.b if side == 0 else self.h - self.b) / 20
            grid = [mpf(0), x]
            while x < mpf(1) / 2:
                x = min(x * mpf("1.12"), x + self.h / 6)
                grid.append(min(x, mpf(1) / 2))
            grid = [-q for q in reversed(grid[1:])] + grid
            slope = [self.boundary(q, side)[1] for q in grid]
            brackets = [(grid[i], grid[i + 1]) for i in range(len(grid) - 1) if (slope[i] > 0) != (slope[i + 1] > 0)]
            assert len(brackets) == 2, "slit ends not bracketed"
            return [mm.findroot(lambda q: self.boundary(q, side)[1], q, solver="anderson", tol=1e-20, verify=False)
                    for q in brackets]

    def polished(self, x, side):
        slope, h = lambda q: self.boundary(q, side)[1], mpf(10) ** (-mp.dps // 4)
        for _ in range(10):
            dx = slope(x) * 2 * h / (slope(x + h) - slope(x - h))
            x = x - dx
            if abs(dx) < mpf(10) ** (-mp.dps * 2 // 3) * abs(x) + mpf(10) ** (-mp.dps):
                break
        return x


def exact(w1, w2, X, Y, theta, guess, most=25):
    """lengths, centre and tilt of the upper strip -> [capacitance, force x, force z, counter-clockwise torque].
    guess = (h, b, Re A, Im A) only starts the iteration. Parallel: the torque is left out (see `exact_torque`)."""
    w1, w2, X, Y, theta = map(mpf, (w1, w2, X, Y, theta))
    tilted = theta != 0
    apex, centre = (X - Y * mp.cot(theta), Y / mp.sin(theta)) if tilted else (mpf(0), X)
    target = mm.matrix([-w1 / 2 - apex, w1 / 2 - apex, centre - w2 / 2, centre + w2 / 2])
    par = [mpf(q) for q in guess]
    if not tilted:
        par[2] = mpf(0)                                  # its place is taken by the shift c

    def build(p, theta=theta):
        return SlitMap(*p, theta) if tilted else SlitMap(p[0], p[1], -Y / (2 * mp.pi), p[3], 0, p[2])
    m = build(par)
    tips = [(x, s) for s in (0, 1) for x in m.tips(s)]
    if not tilted:
        ends = [m.boundary(x, s)[0] for x, s in tips]
        par[2] = (target[0] + target[1] - ends[0] - ends[1]) / 2
    dh, tolerance = mpf(10) ** (-mp.dps // 3), mpf(10) ** (-mp.dps * 3 // 5)
    for _ in range(most):
        m = build(par)
        tips = [(m.polished(x, s), s) for x, s in tips]
        ends = [m.boundary(x, s)[0] for x, s in tips]
        for k in (0, 2):
            if ends[k] > ends[k + 1]:
                ends[k], ends[k + 1] = ends[k + 1], ends[k]
                tips[k], tips[k + 1] = tips[k + 1], tips[k]
        residual = mm.matrix(ends) - target
        J = mm.matrix(4, 4)
        more, less = (build([par[0] * (1 + q)] + par[1:]) for q in (dh, -dh))
        for k, (x, s) in enumerate(tips):
            phase = mp.exp(-1j * theta) if s else mpf(1)
            db, dAr, dAi = m.partials(mpc(x, m.h * s))
            J[k, 0] = (more.boundary(x, s)[0] - less.boundary(x, s)[0]) / (2 * dh * par[0])
            J[k, 1] = (db * phase).real
            J[k, 2] = (dAr * phase).real if tilted else mpf(1)
            J[k, 3] = (dAi * phase).real
        par = [p + q for p, q in zip(par, mm.lu_solve(J, -residual))]
        if max(abs(r) for r in residual) < tolerance * (1 + abs(target[0])):
            break
    else:
        raise RuntimeError("the map did not converge")
    h, moved = par[0], mm.matrix(4, 3)                   # derivative of (map - target) at fixed map parameters
    if tilted:
        more, less = build(par, theta * (1 + dh)), build(par, theta * (1 - dh))
        for k, (x, s) in enumerate(tips):
            turn = (more.boundary(x, s)[0] - less.boundary(x, s)[0]) / (2 * dh * theta)
            moved[k, 0] = 0 if s else -1
            moved[k, 1] = 1 / mp.sin(theta) if s else mp.cot(theta)
            moved[k, 2] = -Y / mp.sin(theta) ** 2 * (mp.cos(theta) if s else 1) - turn
    else:
        m = build(par)
        for k, (x, s) in enumerate(tips):
            moved[k, 0] = 1 if s else 0
            moved[k, 1] = m.partials(mpc(x, m.h * s))[1].real / (2 * mp.pi)
    return [1 / h] + [-mm.lu_solve(J, moved[:, j])[0] / h ** 2 / 2 for j in range(3 if tilted else 2)]
