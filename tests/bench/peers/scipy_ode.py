"""scipy: DOP853 by solve_ivp and LSODA by odeint, with right-hand sides compiled by numba."""

import math

import numba
import numpy as np
from scipy.integrate import odeint, solve_ivp

from .problem import Job

TOLERANCE = 1e-13
MOST_STEPS = 10**6


@numba.njit(fastmath={"contract"})
def motion(t, s, mu):
    o = np.empty(6)
    om = 1.0 - mu
    e1, e2 = s[0] + mu, s[0] - om
    yz = s[1] * s[1] + s[2] * s[2]
    q1, q2 = e1 * e1 + yz, e2 * e2 + yz
    a, b = om / (q1 * math.sqrt(q1)), mu / (q2 * math.sqrt(q2))
    o[0], o[1], o[2] = s[3], s[4], s[5]
    o[3] = 2.0 * s[4] + s[0] - a * e1 - b * e2
    o[4] = (1.0 - a - b) * s[1] - 2.0 * s[3]
    o[5] = -(a + b) * s[2]
    return o


@numba.njit(fastmath={"contract"})
def motion_and_matrix(t, s, mu):
    o = np.empty(42)
    om = 1.0 - mu
    x, y, z = s[0], s[1], s[2]
    e1, e2 = x + mu, x - om
    yz = y * y + z * z
    q1, q2 = e1 * e1 + yz, e2 * e2 + yz
    a, b = om / (q1 * math.sqrt(q1)), mu / (q2 * math.sqrt(q2))
    c = 1.0 - a - b
    o[0], o[1], o[2] = s[3], s[4], s[5]
    o[3] = 2.0 * s[4] + x - a * e1 - b * e2
    o[4] = c * y - 2.0 * s[3]
    o[5] = -(a + b) * z
    a5, b5 = 3.0 * a / q1, 3.0 * b / q2
    ab, g = a5 + b5, a5 * e1 + b5 * e2
    uxx, uyy, uzz = c + a5 * e1 * e1 + b5 * e2 * e2, c + ab * y * y, c - 1.0 + ab * z * z
    uxy, uxz, uyz = g * y, g * z, ab * y * z
    for j in range(18):
        o[6 + j] = s[24 + j]
    for j in range(6):
        p, q, r = s[6 + j], s[12 + j], s[18 + j]
        o[24 + j] = uxx * p + uxy * q + uxz * r + 2.0 * s[30 + j]
        o[30 + j] = uxy * p + uyy * q + uyz * r - 2.0 * s[24 + j]
        o[36 + j] = uxz * p + uyz * q + uzz * r
    return o


def make(case, method):
    function = motion_and_matrix if case.matrix else motion
    start = np.concatenate([case.states[0], np.eye(6).ravel()]) if case.matrix else case.states[0]
    final = np.empty_like(start)

    def lsoda():
        options = {"tfirst": True, "rtol": TOLERANCE, "atol": TOLERANCE, "mxstep": MOST_STEPS}
        return odeint(function, start, (0.0, case.t), args=(case.mu,), **options)[-1]

    def dop853():
        options = {"method": "DOP853", "rtol": TOLERANCE, "atol": TOLERANCE}
        return solve_ivp(function, (0.0, case.t), start, args=(case.mu,), **options).y[:, -1]

    solve = {"LSODA": lsoda, "DOP853": dop853}[method]

    def run(n):
        for _ in range(n):
            final[:] = solve()

    return Job(run, lambda: (final[None, :6], final[6:].reshape(6, 6) if case.matrix else None))


PEERS = {
    "scipy DOP853": (("single", "matrix"), lambda case: make(case, "DOP853")),
    "scipy odeint": (("single", "matrix"), lambda case: make(case, "LSODA")),
}
