"""Recomputes wedge-ideal.json: tilted plates without fringe, in closed form.

* sector: plates along r1 <= r <= r2 at the opening angle theta, field lines arcs r theta (exact between insulating
  arcs); per unit width and voltage C/eps0 = ln(r2/r1)/theta, F = (r2 - r1)/(2 theta^2 r1 r2) normal to a plate, torque
  about the apex ln(r2/r1)/(2 theta^2).
* lamella: local parallel plates, gap d (1 + beta u), u in [-1, 1] along the length L, hinge line an arm R from the
  plate's centre on the side of u = -1: C/C0 = artanh(beta)/beta, F/F0 = 1/(1 - beta^2),
  T/(F0 R) = 1/(1 - beta^2) + (L / 2 R beta) (artanh(beta)/beta - 1/(1 - beta^2)).

    python wedge_ideal.py [PART OF A NAME ...] [--update]
"""
import mpmath as mp

import store

mp.mp.dps = 30


def sector(r1, r2, theta):
    """-> C/eps0, normal force, torque about the apex, per unit width and V^2"""
    log = mp.log(r2 / r1)
    return log / theta, (r2 - r1) / (2 * theta ** 2 * r1 * r2), log / (2 * theta ** 2)


def lamella(beta, length_over_arm):
    """-> C/C0, F/F0, T/(F0 R)"""
    c = mp.atanh(beta) / beta if beta != 0 else mp.mpf(1)
    f = 1 / (1 - beta ** 2)
    return c, f, f + (length_over_arm / (2 * beta) * (c - f) if beta != 0 else 0)


def lamella_by_quadrature(beta, length_over_arm):
    """the same by integration over the lamellas"""
    h = lambda u: 1 + beta * u
    mean = lambda f: mp.quad(f, [-1, 0, 1]) / 2
    return mean(lambda u: 1 / h(u)), mean(lambda u: h(u) ** -2), mean(lambda u: (1 + length_over_arm * u / 2) / h(u) ** 2)


def compute(case, args):
    g = {k: mp.mpf(repr(v)) for k, v in case["geometry"].items()}
    if case["group"] == "sector":
        C, F, T = sector(g["inner_radius"], g["outer_radius"], mp.radians(g["opening_deg"]))
        return dict(capacitance=C, normal_force=F, torque_apex=T)
    C, F, T = lamella(g["beta"], g["length_over_arm"])
    return dict(capacitance_factor=C, force_factor=F, torque_factor=T)


if __name__ == "__main__":
    store.run("wedge-ideal", compute)
