"""The cases, as our own program states them, and the error of a result against the truth."""

import dataclasses
import json
import pathlib
from decimal import Decimal, localcontext

import numpy as np

TRUTH = pathlib.Path(__file__).parents[2] / "mechanics/reference/trajectories.txt"


@dataclasses.dataclass(frozen=True)
class Case:
    """One or many states, propagated over t, with or without d(final)/d(initial)."""

    name: str
    mu: float
    states: np.ndarray
    t: float
    matrix: bool

    @classmethod
    def read(cls, name, body):
        """From the body of a request, whose decimals are those of the doubles that our program takes."""
        request = json.loads(body)
        states = [state["position"] + state["velocity"] for state in request["initial_states"]]
        matrix = request["state_transition_matrix"] == "final"
        return cls(name, request["system"]["mass_parameter"], np.array(states), request["duration"], matrix)

    @property
    def kind(self):
        return "matrix" if self.matrix else "ensemble" if len(self.states) > 1 else "single"


@dataclasses.dataclass
class Job:
    """A peer ready for a case: `run(n)` propagates it n times, `result()` gives final states and matrix."""

    run: object
    result: object
    # Propagation over no time by the same Python loop: the cost of the call, where it is to be taken off.
    empty: object = None


def truth(name):
    """Rows of the table by their second column, in decimal."""
    fields = (line.split() for line in TRUTH.read_text().splitlines() if line.startswith(f"{name} "))
    return {row: [Decimal(number) for number in numbers] for _, row, *numbers in fields}


def distance(state, true):
    """Of positions; subtracted in decimal, without rounding."""
    with localcontext() as context:
        context.prec = 60
        difference = [Decimal(float(ours)) - exact for ours, exact in zip(state[:3], true[:3])]
        return float(sum(d * d for d in difference).sqrt())


def error(case, states, matrix):
    """Of the matrix, relative to its largest element, where there is one; else of the position, the largest."""
    rows = truth(case.name)
    if case.matrix:
        exact = np.array([[float(number) for number in rows[f"m{i}"]] for i in range(6)])
        return float(np.abs(np.asarray(matrix) - exact).max() / np.abs(exact).max())
    if case.kind == "ensemble":
        return max(distance(states[int(member)], true) for member, true in rows.items())
    return distance(states[0], rows["final"])
