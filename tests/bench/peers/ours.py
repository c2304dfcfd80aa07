"""Our side: the program `cases`, in a process of its own for each measurement.

Where the stack of a process begins modulo 64 bytes is random and can make SIMD code slower: the median over processes
is what a user gets. The peers, which share one process, get the best of several stacks instead.
"""

import json
import subprocess

import numpy as np

from .problem import Case


class Program:
    def __init__(self, binary):
        self.binary = binary

    def ask(self, *arguments):
        done = subprocess.run([self.binary, *arguments], check=True, capture_output=True, text=True)
        return done.stdout

    def paths(self):
        """The kernels that this machine can run, the one it chooses first."""
        return json.loads(self.ask("paths"))

    def names(self):
        return json.loads(self.ask("names"))

    def case(self, name):
        return Case.read(name, self.ask("request", name))

    def solve(self, name, path):
        """Final states, matrix of the last trajectory if there is one, steps."""
        solution = json.loads(self.ask("solve", name, path))
        matrices = solution["matrices"]
        matrix = np.array(matrices[-1]).reshape(6, 6) if matrices else None
        return np.array(solution["states"]), matrix, solution["steps"]

    def time(self, name, path, seconds):
        """Processor time of a trajectory, s, measured over at least so many seconds."""
        measured = json.loads(self.ask("time", name, str(seconds), path))
        return measured["seconds"] / measured["trajectories"]
