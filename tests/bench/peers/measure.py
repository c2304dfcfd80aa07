"""Times ours and theirs by turns, in processor time of the whole process on one thread."""

import importlib
import statistics
import sys
import time

from .problem import error

MODULES = ("heyoka_taylor", "numba_dop853", "scipy_ode")
# A repeat lasts at least so long, s, and the calls over no time this many times.
FLOOR = 0.025
EMPTY_CALLS = 5000
# Where a measurement lasts longer than this, s, it is of scalar code, which does not mind where its stack begins.
LONG = 0.5
DEPTHS = 6
# Added to the name of a case: the same trajectory many at once, and in more digits.
LANES, DOUBLE_DOUBLE = "_lanes", "_double_double"


def is_case(name):
    """Whether it is raced by itself, and is no variant of another."""
    return not name.endswith((LANES, DOUBLE_DOUBLE))


def log(*words):
    print(*words, file=sys.stderr, flush=True)


def all_peers():
    """Every peer whose library is there, by name: the kinds of cases it is for, and its maker."""
    peers = {}
    for module in MODULES:
        try:
            peers |= importlib.import_module(f".{module}", __package__).PEERS
        except ImportError as missing:
            log(f"not raced against, for it is not installed here: {missing.name}")
    return peers


def nested(function, depth):
    """function() below `depth` more C frames; each level moves the stack by another amount modulo 64."""
    return function() if depth == 0 else next(map(lambda _: nested(function, depth - 1), (0,)))


def clock(run, n, depth=0):
    """Processor time of run(n), s."""
    begun = time.process_time()
    nested(lambda: run(n), depth)
    return time.process_time() - begun


class Peer:
    """A library on a case, compiled and warm."""

    def __init__(self, case, make):
        self.case, self.job, self.depth, self.times = case, make(case), 0, []
        self.trajectories = len(case.states)
        run = self.job.run
        clock(run, 1)
        self.n, self.taken = 1, clock(run, 1)
        while self.taken < FLOOR:
            self.n = max(self.n + 1, int(1.2 * self.n * FLOOR / max(self.taken, 1e-6)) + 1)
            self.taken = clock(run, self.n)

    def is_long(self):
        return self.taken > LONG

    def settle(self):
        """Finds its best stack, and how fast it is there. To be called like `repeat`, for a caller in C, a constructor say, moves the stack."""
        if self.is_long():
            return
        # CPython specialises these calls after a while, and the frames change.
        for _ in range(100):
            clock(lambda n: None, 1, DEPTHS - 1)
        phases = []
        for depth in range(DEPTHS):
            phases.append(clock(self.job.run, self.n, depth))
        self.taken = min(phases)
        self.depth = phases.index(self.taken)

    def repeat(self):
        self.times.append(clock(self.job.run, self.n, self.depth) / (self.n * self.trajectories))

    def summary(self):
        found = summary(self.times, error(self.case, *self.job.result()))
        if self.job.empty:
            n = self.n if self.trajectories > 1 else max(self.n, EMPTY_CALLS)
            calls = [clock(self.job.empty, n) / (n * self.trajectories) for _ in range(5)]
            found["call_overhead"] = statistics.median(calls)
            for name in ("seconds", "min"):
                found[name] -= found["call_overhead"]
        return found


class Ours:
    """Our program on a case by one of its paths."""

    def __init__(self, program, case, name, path):
        self.program, self.case, self.name, self.path, self.times = program, case, name, path, []

    def repeat(self):
        self.times.append(self.program.time(self.name, self.path, FLOOR))

    def summary(self):
        states, matrix, steps = self.program.solve(self.name, self.path)
        return summary(self.times, error(self.case, states, matrix)) | {"steps": steps / len(states)}


def summary(times, error):
    return {"seconds": statistics.median(times), "min": min(times), "repeats": len(times), "error": error}


def race(program, name, paths, peers, repeats):
    """Everybody on one case: {"ours": {variant: {path: …}}, "peers": {name: …}}, seconds are of a trajectory."""
    case = program.case(name)
    ours = {
        (variant, path): Ours(program, case, variant, path)
        for variant in (name, name + LANES, name + DOUBLE_DOUBLE)
        if variant in program.names()
        for path in paths
    }
    theirs = {}
    for peer, (kinds, make) in peers.items():
        if case.kind in kinds:
            log(f"{name}: {peer} gets ready")
            one = Peer(case, make)
            one.settle()
            if not one.is_long():
                # Code compiled in lanes comes out a third slower now and then: the faster of two.
                other = Peer(case, make)
                other.settle()
                one = min(one, other, key=lambda peer: peer.taken / peer.n)
            theirs[peer] = one
    for turn in range(repeats):
        log(f"{name}: turn {turn + 1} of {repeats}")
        for one in (*ours.values(), *theirs.values()):
            one.repeat()
    found = {"kind": case.kind, "ours": {}, "peers": {peer: one.summary() for peer, one in theirs.items()}}
    for (variant, path), one in ours.items():
        found["ours"].setdefault(variant, {})[path] = one.summary()
    return found
