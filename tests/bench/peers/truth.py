"""The true final states and matrices of the cases: a Taylor integration by heyoka in 333-bit arithmetic."""

from decimal import Decimal

import heyoka as hy
import numpy as np

from .heyoka_taylor import system

BITS = 333
DIGITS = 45
# One in 625 of the ensemble, away from the ends of its blocks.
MEMBERS = range(312, 10000, 625)
HEAD = """\
# Final states from the binary64 inputs of cases.rs, 1 - mu without rounding, by a 333-bit Taylor integration with a
# general-purpose library (heyoka 7.13), which agrees with a 50-digit integrator to 31 digits. Columns: case; `final`,
# index of a member, or `m` and a row of d(final)/d(initial); x y z vx vy vz, or the six columns of the row.
"""


def real(value):
    return hy.real(float(value), BITS)


def digits(value):
    exact = Decimal(str(value))
    return f"{exact:.{DIGITS}e}" if exact else "0"


class Integrator:
    def __init__(self, mu, columns):
        mu, one = hy.expression(real(mu)), hy.expression(real(1.0))
        equations = system(mu, columns, one)
        zero = np.array([real(0.0)] * len(equations))
        self.taylor = hy.taylor_adaptive(equations, zero, fp_type=hy.real, prec=BITS, compact_mode=True)

    def final(self, initial, t):
        self.taylor.time = real(0.0)
        self.taylor.state[:] = np.array([real(value) for value in initial])
        self.taylor.propagate_until(real(t))
        return [digits(value) for value in self.taylor.state]


def rows(case):
    integrator = Integrator(case.mu, 6 if case.matrix else 0)
    if case.kind == "ensemble":
        for member in MEMBERS:
            yield str(member), integrator.final(case.states[member], case.t)
        return
    identity = np.eye(6).ravel() if case.matrix else []
    final = integrator.final(np.concatenate([case.states[0], identity]), case.t)
    yield "final", final[:6]
    for i in range(6 if case.matrix else 0):
        yield f"m{i}", [final[6 + 6 * column + i] for column in range(6)]


def table(cases):
    lines = [" ".join([case.name, row, *numbers]) for case in cases for row, numbers in rows(case)]
    return HEAD + "\n".join(lines)
