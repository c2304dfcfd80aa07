"""heyoka: Taylor series, compiled at run time; one trajectory, batches, and one lane per column of the matrix.

`compact_mode` and `slp_vectorize` are slower here, fast_math is faster. The variational equations written by hand are
15 to 20 % faster than those heyoka derives.
"""

import heyoka as hy
import numpy as np

from .problem import Job

hy.set_nthreads(1)


def system(mu, columns=0, one=1.0):
    """The equations, followed by so many columns of the variational equations; in the arithmetic of mu and `one`."""
    x, y, z, u, v, w = hy.make_vars("x", "y", "z", "vx", "vy", "vz")
    one_minus_mu = one - mu
    d1, d2 = x + mu, x - one_minus_mu
    q1 = hy.sum([d1**2.0, y**2.0, z**2.0])
    q2 = hy.sum([d2**2.0, y**2.0, z**2.0])
    a, b = one_minus_mu * q1**-1.5, mu * q2**-1.5
    c = 1.0 - a - b
    equations = [(x, u), (y, v), (z, w)]
    equations += [(u, 2.0 * v + x - a * d1 - b * d2), (v, -2.0 * u + c * y), (w, -(a + b) * z)]
    if columns:
        a5, b5 = 3.0 * a / q1, 3.0 * b / q2
        ab, g = a5 + b5, a5 * d1 + b5 * d2
        uxx, uyy, uzz = c + a5 * d1**2.0 + b5 * d2**2.0, c + ab * y**2.0, c - 1.0 + ab * z**2.0
        uxy, uxz, uyz = g * y, g * z, ab * (y * z)
    for j in range(columns):
        p = hy.make_vars(*[f"p{j}_{r}" for r in range(6)])
        equations += [(p[0], p[3]), (p[1], p[4]), (p[2], p[5])]
        equations += [
            (p[3], hy.sum([uxx * p[0], uxy * p[1], uxz * p[2], 2.0 * p[4]])),
            (p[4], hy.sum([uxy * p[0], uyy * p[1], uyz * p[2], -2.0 * p[3]])),
            (p[5], hy.sum([uxz * p[0], uyz * p[1], uzz * p[2]])),
        ]
    return equations


def options(tolerance, batch=1):
    chosen = {"compact_mode": False, "fast_math": True, "force_avx512": batch == 8}
    return chosen | ({"tol": tolerance} if tolerance else {})


def scalar(case, tolerance):
    """One trajectory at a time."""
    states = case.states
    if case.matrix:
        states = np.concatenate([states[0], np.eye(6).ravel()])[None, :]
    integrator = hy.taylor_adaptive(system(case.mu, 6 if case.matrix else 0), states[0], **options(tolerance))
    state, final = integrator.state, np.empty_like(states)

    def run(n, t=case.t):
        for _ in range(n):
            for k in range(len(states)):
                integrator.time = 0.0
                state[:] = states[k]
                integrator.propagate_until(t)
                final[k] = state

    def result():
        return final[:, :6], final[0, 6:].reshape(6, 6).T if case.matrix else None

    return Job(run, result, lambda n: run(n, 0.0))


def by_columns(case, tolerance):
    """One lane per column of the matrix, each with its own copy of the trajectory: 12 equations, 6 lanes of 8 used."""
    batch = 8
    initial = np.zeros((12, batch))
    initial[:6] = case.states[0][:, None]
    for j in range(batch):
        initial[6 + j % 6, j] = 1.0
    integrator = hy.taylor_adaptive_batch(system(case.mu, 1), initial, **options(tolerance, batch))
    state = integrator.state

    def run(n, t=case.t):
        for _ in range(n):
            integrator.set_time(0.0)
            state[:] = initial
            integrator.propagate_until(t)

    return Job(run, lambda: (state[:6, :1].T.copy(), state[6:, :6].copy()), lambda n: run(n, 0.0))


def speed_of_motion(states, mu):
    """How fast the motion is at the start; neighbours in this order need about as many steps."""
    off_axis = states[:, 1] ** 2 + states[:, 2] ** 2
    q1, q2 = (states[:, 0] + mu) ** 2 + off_axis, (states[:, 0] - (1 - mu)) ** 2 + off_axis
    return (1 - mu) / (q1 * np.sqrt(q1)) + mu / (q2 * np.sqrt(q2))


def batches(case, tolerance, batch):
    """Trajectories in lanes, sorted so that those of a batch end together; the sorting is timed too."""
    initial = case.states
    first = np.ascontiguousarray(initial[:batch].T)
    integrator = hy.taylor_adaptive_batch(system(case.mu), first, **options(tolerance, batch))
    state, final = integrator.state, np.empty_like(initial)

    def run(n, t=case.t):
        for _ in range(n):
            order = np.argsort(speed_of_motion(initial, case.mu), kind="stable")
            source = np.ascontiguousarray(initial[order].reshape(-1, batch, 6).transpose(0, 2, 1))
            target = np.empty_like(source)
            for k in range(len(source)):
                integrator.set_time(0.0)
                state[:] = source[k]
                integrator.propagate_until(t)
                target[k] = state
            final[order] = target.transpose(0, 2, 1).reshape(-1, 6)

    return Job(run, lambda: (final, None), lambda n: run(n, 0.0))


PEERS = {}
for _name, _tolerance in (("1e-15", 1e-15), ("2.2e-16", 0)):
    PEERS[f"heyoka {_name}"] = (("single", "ensemble", "matrix"), lambda c, t=_tolerance: scalar(c, t))
    PEERS[f"heyoka {_name}, columns in 8 lanes"] = (("matrix",), lambda c, t=_tolerance: by_columns(c, t))
    for _batch in (4, 8):
        PEERS[f"heyoka {_name}, batch of {_batch}"] = (
            ("ensemble",),
            lambda c, t=_tolerance, b=_batch: batches(c, t, b),
        )
