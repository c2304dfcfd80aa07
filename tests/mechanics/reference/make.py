"""Writes the reference tables beside this script with mpmath 1.3 and scipy, by other ways than the crate's.

    python3 make.py

Collinear points: the force on the x axis, bisected (no quintic). Eigenvalues: of the 6x6 matrix of the
linearised equations, by mpmath's QR algorithm (no closed form). Jacobi constants: the plain formula. Regions: the
ascent integrated by scipy's DOP853 until it is deep in a primary's well or far away. Working precision of mpmath
is high enough for every cancellation; 40 digits are printed. Trajectories:
Gragg's midpoint rule, extrapolated (Bulirsch & Stoer). Inputs are the exact values of the doubles printed.
"""

import random
from pathlib import Path

import numpy as np
from mpmath import eig, findroot, matrix, mp, mpf, nstr, sqrt
from scipy.integrate import solve_ivp

HERE = Path(__file__).parent
MASS_PARAMETERS = [
    1e-100, 1e-30, 1e-16, 1e-14, 1e-12, 1e-10, 1e-9, 1e-7, 3.040357143e-06, 1e-5, 1e-4, 0.000953881151934512,
    1e-3, 0.0121505856, 0.0243, 0.038520896504551, 0.03852089650455137, 0.03852089650455139, 0.0385208965045514, 0.0386, 0.05, 0.1,
    0.10877401423594767, 0.2, 0.3, 0.4, 0.49, 0.5,
]


def digits(value):
    return nstr(value, 40)


def jacobi(mu, r, v):
    x, y, z = r
    r1, r2 = sqrt((x + mu) ** 2 + y**2 + z**2), sqrt((x - 1 + mu) ** 2 + y**2 + z**2)
    terms = [x**2 + y**2, 2 * (1 - mu) / r1, 2 * mu / r2, -sum(c**2 for c in v)]
    return sum(terms), max(abs(t) for t in terms)


def force(mu, x):
    d1, d2 = x + mu, x - 1 + mu
    return x - (1 - mu) * d1 / abs(d1) ** 3 - mu * d2 / abs(d2) ** 3


def collinear(mu):
    """Positions of L1, L2, L3, between bounds on either side of each."""
    hill = mp.cbrt(mu / 3)
    inside, outside = 1 - mu - mpf(2) * hill / 5, 1 - mu + hill / 2
    brackets = [(max(1 - mu - 2 * hill, -mu + mpf(1) / 10), inside), (outside, 1 - mu + 2 * hill), (-mu - 1 - mu, -mu - 1 + mu)]
    return [findroot(lambda x: force(mu, x), b, solver="anderson", tol=mpf(10) ** (-mp.dps), maxsteps=5000,
                     verify=False) for b in brackets]


def eigenvalues(mu, r):
    d = [matrix([r[0] + mu, r[1], 0]), matrix([r[0] - 1 + mu, r[1], 0])]
    hessian = mp.diag([1, 1, 0])
    for share, offset in zip((1 - mu, mu), d):
        square = (offset.T * offset)[0]
        hessian += 3 * share * offset * offset.T / square ** mpf("2.5") - share * mp.eye(3) / square ** mpf("1.5")
    motion = mp.zeros(6)
    for i in range(3):
        motion[i, i + 3] = 1
        for j in range(3):
            motion[i + 3, j] = hessian[i, j]
    motion[3, 4], motion[4, 3] = 2, -2
    noise = mpf(10) ** (-mp.dps // 3)
    clean = lambda part: mpf(0) if abs(part) < noise else part
    found = [(clean(mp.re(e)), clean(mp.im(e))) for e in eig(motion, left=False, right=False)]
    return sorted(found, key=lambda e: (-round(e[0] / noise), -e[1]))


def equilibria():
    rows = ["# mu point r1 r2 C_plain C_minus_C_of_L4 | re im of six eigenvalues, by decreasing re, then im"]
    for mu in MASS_PARAMETERS:
        mp.dps = 600 if mu < 1e-17 else 150
        mu_exact = mpf(mu)
        points = [(x, mpf(0)) for x in collinear(mu_exact)] + [(mpf(1) / 2 - mu_exact, sqrt(mpf(3)) / 2)]
        last = jacobi(mu_exact, (*points[3], mpf(0)), [0])[0]
        for name, r in zip(("L1", "L2", "L3", "L4"), points):
            r1, r2 = sqrt((r[0] + mu_exact) ** 2 + r[1] ** 2), sqrt((r[0] - 1 + mu_exact) ** 2 + r[1] ** 2)
            assert r[1] != 0 or abs(force(mu_exact, r[0])) < mpf(10) ** (-mp.dps // 3)
            c = jacobi(mu_exact, (*r, mpf(0)), [0])[0]
            values = [digits(v) for v in (r1, r2, c, c - last)]
            values += [digits(part) for pair in eigenvalues(mu_exact, r) for part in pair]
            rows.append(" ".join([repr(mu), name, *values]))
    (HERE / "equilibria.txt").write_text("\n".join(rows) + "\n")


def states():
    rows = ["# mu x y z vx vy vz C_plain largest_term"]
    mp.dps = 60
    pick = random.Random(1)
    for index in range(400):
        mu = pick.choice([1e-16, 1e-9, 3e-6, 0.0121505856, 0.1, 0.5])
        size = 10 ** pick.uniform(*[(-12, -1), (-12, -1), (-1, 1), (1, 6)][index % 4])
        centre = [1 - mu, -mu, 0.0, 0.0][index % 4]
        r = [pick.gauss(0, size), pick.gauss(0, size), pick.choice([0, 1]) * pick.gauss(0, size)]
        r[0] += centre
        v = [pick.choice([0, 1]) * pick.gauss(0, 10 ** pick.uniform(-3, 3)) for _ in range(3)]
        c, largest = jacobi(mpf(mu), [mpf(p) for p in r], [mpf(p) for p in v])
        rows.append(" ".join([*(repr(float(p)) for p in (mu, *r, *v)), digits(c), digits(largest)]))
    (HERE / "jacobi.txt").write_text("\n".join(rows) + "\n")


def region(mu, r):
    """Where the ascent ends, or None if it takes too long to be sure."""

    def ascent(_, r):
        d1, d2 = r + [mu, 0, 0], r + [mu - 1, 0, 0]
        gradient = [r[0], r[1], 0] - (1 - mu) * d1 / np.linalg.norm(d1) ** 3 - mu * d2 / np.linalg.norm(d2) ** 3
        return gradient

    wells = [
        (lambda _, r: np.linalg.norm(r + [mu, 0, 0]) - 0.25),
        (lambda _, r: np.linalg.norm(r + [mu - 1, 0, 0]) - 0.2 * np.cbrt(mu / 3)),
        (lambda _, r: 3 - np.hypot(r[0], r[1])),
    ]
    for well in wells:
        well.terminal = True
    end = solve_ivp(ascent, (0, 60), r, "DOP853", events=wells, rtol=1e-9, atol=1e-13)
    return next((name for name, hit in zip(("larger", "smaller", "outside"), end.t_events) if len(hit)), None)


def regions():
    rows = ["# mu x y z region"]
    pick = random.Random(2)
    while len(rows) <= 300:
        mu = pick.choice([1e-6, 3e-4, 0.0121505856, 0.1, 0.3, 0.5])
        hill = np.cbrt(mu / 3)
        if len(rows) % 2:
            r = [1 - mu + pick.gauss(0, 1.5 * hill), pick.gauss(0, 1.5 * hill), pick.gauss(0, 0.7 * hill)]
        else:
            angle, radius = pick.uniform(0, 6.3), 1 + pick.gauss(0, 0.7 * hill)
            r = [radius * np.cos(angle) - mu, radius * np.sin(angle), pick.choice([0, 1]) * pick.gauss(0, 0.4)]
        end = region(mu, np.array(r))
        if end:
            rows.append(" ".join([*(repr(float(p)) for p in (mu, *r)), end]))
    (HERE / "regions.txt").write_text("\n".join(rows) + "\n")


def rates(mu, state):
    x, y, z, vx, vy, vz = state
    n = (1 - mu) / sqrt((x + mu) ** 2 + y**2 + z**2) ** 3
    f = mu / sqrt((x - 1 + mu) ** 2 + y**2 + z**2) ** 3
    return [vx, vy, vz, x + 2 * vy - n * (x + mu) - f * (x - 1 + mu), y - 2 * vx - (n + f) * y, -(n + f) * z]


def midpoint(mu, start, length, parts):
    h = length / parts
    before, here = start, [a + h * b for a, b in zip(start, rates(mu, start))]
    for _ in range(parts - 1):
        before, here = here, [a + 2 * h * b for a, b in zip(before, rates(mu, here))]
    return [(a + b + h * c) / 2 for a, b, c in zip(before, here, rates(mu, here))]


def extrapolated(mu, start, length, tolerance, columns=18):
    """The state a step on; None where the columns do not converge."""
    table = []
    for column in range(columns):
        row = [midpoint(mu, start, length, 2 * (column + 1))]
        for k in range(1, column + 1):
            ratio = (mpf(column + 1) / (column + 1 - k)) ** 2 - 1
            row.append([a + (a - b) / ratio for a, b in zip(row[-1], table[k - 1])])
        if table and max(abs(a - b) for a, b in zip(row[-1], row[-2])) < tolerance:
            return row[-1]
        table = row
    return None


def propagated(mu, state, duration):
    """Also the nearest distance to the smaller primary at the ends of the steps."""
    time, length, nearest = mpf(0), duration / 64, mpf(1)
    while time < duration:
        length = min(length, duration - time)
        after = extrapolated(mu, state, length, mpf(10) ** -44)
        if after is None:
            length /= 2
            continue
        state, time = after, time + length
        nearest = min(nearest, sqrt((state[0] - 1 + mu) ** 2 + state[1] ** 2 + state[2] ** 2))
        length *= mpf(3) / 2
    return state, nearest


def extrapolations():
    """A regular orbit about the larger primary; falls towards the smaller one from 0.01 with little angular momentum,
    past it and back again."""
    rows = ["# case mu x y z vx vy vz t | x y z vx vy vz at t, nearest distance to the smaller primary on the way"]
    mp.dps = 60
    mu = 0.01215058560962404
    cases = [("regular", [0.31, 0.0, 0.05, 0.0, 1.52, 0.1], 1.117)]
    for nearest in (1e-5, 1e-6, 1e-7):
        across = float(sqrt(2 * mpf(mu) * nearest) / mpf(0.01) / sqrt(2))
        cases.append(("fly_by", [1 - mu + 0.01, 0.0, 0.0, 0.0, across - 0.01, across], 0.02))
    for case, start, t in cases:
        end, reached = propagated(mpf(mu), [mpf(c) for c in start], mpf(t))
        inputs = [repr(c) for c in (mu, *start, t)]
        rows.append(" ".join([case, *inputs, *(digits(c) for c in end), nstr(reached, 3)]))
    (HERE / "extrapolations.txt").write_text("\n".join(rows) + "\n")


if __name__ == "__main__":
    extrapolations()
    equilibria()
    states()
    regions()
