"""The circular restricted three-body problem written down from its definition, for numpy and mpmath alike.

Szebehely 1967, Theory of Orbits, chapter 1: normalised synodic coordinates, larger primary at -mu, smaller at 1 - mu.
"""

import mpmath
import numpy as np
from scipy.integrate import solve_ivp

TIGHT = {"method": "DOP853", "rtol": 1e-13, "atol": 1e-15}


def distances(mu, position, sqrt=np.sqrt):
    x, y, z = position
    return sqrt((x + mu) ** 2 + y**2 + z**2), sqrt((x - 1 + mu) ** 2 + y**2 + z**2)


def derivative(mu, state, sqrt=np.sqrt):
    """Time derivative of (x, y, z, vx, vy, vz) in rotating axes."""
    x, y, z, u, v, w = state
    r1, r2 = distances(mu, (x, y, z), sqrt)
    larger, smaller = (1 - mu) / r1**3, mu / r2**3
    return [
        u,
        v,
        w,
        2 * v + x - larger * (x + mu) - smaller * (x - 1 + mu),
        -2 * u + y - (larger + smaller) * y,
        -(larger + smaller) * z,
    ]


def curvature(mu, position, sqrt=np.sqrt):
    """Second derivatives of the effective potential, three rows of three."""
    bodies = zip((1 - mu, mu), (-mu, 1 - mu), distances(mu, position, sqrt))
    rows = [[0 * mu for _ in range(3)] for _ in range(3)]
    rows[0][0] = rows[1][1] = rows[0][0] + 1
    for mass, place, r in bodies:
        arm = (position[0] - place, position[1], position[2])
        for i in range(3):
            for j in range(3):
                rows[i][j] += mass * (3 * arm[i] * arm[j] / r**5 - (i == j) / r**3)
    return rows


def linear(mu, position, sqrt=np.sqrt):
    """The matrix of the variational equations, six rows of six."""
    rows = [[0 * mu for _ in range(6)] for _ in range(6)]
    for i in range(3):
        rows[i][i + 3] += 1
        for j, value in enumerate(curvature(mu, position, sqrt)[i]):
            rows[i + 3][j] += value
    rows[3][4] += 2
    rows[4][3] -= 2
    return rows


def jacobi_terms(mu, position, velocity, sqrt=np.sqrt):
    """The terms whose sum is the Jacobi constant."""
    r1, r2 = distances(mu, position, sqrt)
    square = sum(component**2 for component in velocity)
    return [position[0] ** 2 + position[1] ** 2, 2 * (1 - mu) / r1, 2 * mu / r2, -square]


def flow(mu, state, duration, **options):
    """scipy's solution over the duration."""
    options = TIGHT | options
    solution = solve_ivp(lambda _, s: derivative(mu, s), (0, duration), state, **options)
    assert solution.success
    return solution


def flow_with_matrix(mu, state, duration):
    """scipy's final state and state transition matrix, by the variational equations."""

    def rate(_, s):
        matrix = np.array(linear(mu, s[:3])) @ s[6:].reshape(6, 6)
        return np.concatenate([derivative(mu, s[:6]), matrix.ravel()])

    solution = solve_ivp(rate, (0, duration), np.concatenate([state, np.eye(6).ravel()]), **TIGHT)
    assert solution.success
    return solution.y[:6, -1], solution.y[6:, -1].reshape(6, 6)


def exact_flow(mu, state, duration, digits=40):
    """mpmath's solution from the very bits of the state."""
    with mpmath.workdps(digits):
        mu = mpmath.mpf(mu)
        start = [mpmath.mpf(component) for component in state]
        # odefun goes forward only; backwards it is the equation with the sign of time changed.
        sign = 1 if duration >= 0 else -1
        solution = mpmath.odefun(
            lambda _, s: [sign * rate for rate in derivative(mu, s, mpmath.sqrt)], mpmath.mpf(0), start
        )
        return solution(mpmath.mpf(abs(duration)))


def vector(state):
    """A state of an answer as (x, y, z, vx, vy, vz)."""
    return np.array([*state["position"], *state["velocity"]])


def wire(state, time=0.0):
    """(x, y, z, vx, vy, vz) as a state of a request."""
    state = [float(component) for component in state]
    return {"time": float(time), "position": state[:3], "velocity": state[3:]}
