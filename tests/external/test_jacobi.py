"""Jacobi constants against mpmath, and what they open against the constants of the equilibria."""

import random

import mpmath
import pytest
from mpmath import mpf

import model

ROUND_OFF = 4e-16
PASSAGES = ["L1", "L2", "L3"]
JOINED = {"L1": {"around_larger", "around_smaller"}, "L2": {"around_smaller", "outside"}, "L3": {"around_larger", "outside"}}


def states(mu, seed, count=60):
    """Near either primary, about them and far away, at rest to fast."""
    pick = random.Random(seed)
    for _ in range(count):
        centre = pick.choice([-mu, 1 - mu, 0.0, 0.5 - mu])
        size = 10 ** pick.uniform(-4, 1)
        place = [centre + size * pick.gauss(0, 1), size * pick.gauss(0, 1), pick.choice([0, 1]) * size * pick.gauss(0, 1)]
        speed = pick.choice([0.0, 0.1, 1.0, 5.0])
        yield [*place, *(speed * pick.gauss(0, 1) for _ in range(3))]


@pytest.mark.parametrize("form", ["plain", "symmetric"])
@pytest.mark.parametrize("mu", [1e-12, 3.04e-6, 0.01215, 0.2, 0.5])
def test_constants(service, mu, form):
    given = list(states(mu, f"{mu} {form}"))
    body = {"system": {"mass_parameter": mu}, "jacobi_form": form, "states": [model.wire(state) for state in given]}
    answer = service.post("/v1/jacobi", **body)
    with mpmath.workdps(50):
        exact = mpf(mu)
        shift = exact * (1 - exact) if form == "symmetric" else mpf(0)
        for state, found in zip(given, answer["states"], strict=True):
            place, velocity = [mpf(c) for c in state[:3]], [mpf(c) for c in state[3:]]
            terms = [*model.jacobi_terms(exact, place, velocity, mpmath.sqrt), shift]
            constant, largest = mpmath.fsum(terms), max(abs(term) for term in terms)
            speed = mpmath.norm(velocity)
            r1, r2 = model.distances(exact, place, mpmath.sqrt)
            assert abs(found["jacobi_constant"] - constant) <= ROUND_OFF * largest
            assert found["energy"] == -found["jacobi_constant"] / 2
            assert abs(found["effective_potential"] - (constant + speed**2) / 2) <= ROUND_OFF * largest
            assert abs(found["speed"] - speed) <= ROUND_OFF * speed
            assert abs(found["distance_to_larger"] - r1) <= ROUND_OFF * max(1, r1)
            assert abs(found["distance_to_smaller"] - r2) <= ROUND_OFF * max(1, r2)
            for name, critical in answer["equilibria"].items():
                assert abs(found["above"][name] - (constant - critical)) <= ROUND_OFF * max(largest, 3), name


@pytest.mark.parametrize("mu", [3.04e-6, 0.01215, 0.5])
def test_passages(service, mu):
    given = [model.wire(state) for state in states(mu, f"passages {mu}")]
    answer = service.post("/v1/jacobi", system={"mass_parameter": mu}, states=given)
    critical = answer["equilibria"]
    for found in answer["states"]:
        constant = found["jacobi_constant"]
        wanted = [name for name in PASSAGES if constant < critical[name]]
        if constant <= critical["L4"]:
            wanted.append("L4_L5")
        assert found["open_passages"] == wanted
        reached, grown = {found["region"]}, True
        while grown:
            more = set().union(*(JOINED[name] for name in wanted if name in JOINED and JOINED[name] & reached))
            grown = not more <= reached
            reached |= more
        assert set(found["reachable_regions"]) == reached


def test_physical_units(service):
    """Both bodies' two-body potentials and the centrifugal one, in km and s, straight from the masses."""
    larger, smaller, separation = 398600.4355, 4902.800118, 384400.0
    system = {
        "larger": {"name": "A", "gm_km3_s2": larger},
        "smaller": {"name": "B", "gm_km3_s2": smaller},
        "separation_km": separation,
    }
    place, velocity = [120000.0, -80000.0, 30000.0], [0.3, 0.9, -0.2]
    units = {"length": "km", "time": "d", "velocity": "km/s"}
    body = {"system": system, "units": units, "states": [{"position": place, "velocity": velocity}]}
    found = service.post("/v1/jacobi", **body)["states"][0]
    with mpmath.workdps(40):
        a, b, d = mpf(larger), mpf(smaller), mpf(separation)
        x, y, z = map(mpf, place)
        r1 = mpmath.sqrt((x + d * b / (a + b)) ** 2 + y**2 + z**2)
        r2 = mpmath.sqrt((x - d * a / (a + b)) ** 2 + y**2 + z**2)
        constant = (a + b) / d**3 * (x**2 + y**2) + 2 * a / r1 + 2 * b / r2 - sum(mpf(v) ** 2 for v in velocity)
        assert abs(found["jacobi_constant"] - constant) <= 1e-15 * abs(2 * a / r1)
