"""Conversions of units against mpmath, and doubles that have to come back in their very bits."""

import math
import random
import struct

import mpmath
import pytest
from mpmath import mpf

# A result is right to two roundings beside that of the system's own scales.
ROUND_OFF = 6e-16
SYSTEM = {"mass_parameter": 0.0121505856, "length_km": 384400.0, "time_s": 375190.26}

# Sizes in km, s and rad. au: IAU 2012 Resolution B2; yr: the Julian year of 365.25 d; both exact.
LENGTHS = {"km": "1", "m": "1e-3", "au": "149597870.7"}
TIMES = {"s": "1", "min": "60", "h": "3600", "d": "86400", "yr": "31557600"}
VELOCITIES = {"km/s": "1", "m/s": "1e-3"}
ACCELERATIONS = {"km/s^2": "1", "m/s^2": "1e-3"}
SQUARES = {"km^2/s^2": "1", "m^2/s^2": "1e-6"}


def sizes(quantity):
    """How many base units each unit of the quantity has, at mpmath's working precision."""
    length, time = mpf(SYSTEM["length_km"]), mpf(SYSTEM["time_s"])
    table, normal = {
        "length": (LENGTHS, length),
        "time": (TIMES, time),
        "velocity": (VELOCITIES, length / time),
        "acceleration": (ACCELERATIONS, length / time**2),
        "energy": (SQUARES, (length / time) ** 2),
        "jacobi_constant": (SQUARES, (length / time) ** 2),
        "angle_rate": ({}, 1 / time),
    }[quantity]
    table = {unit: mpf(size) for unit, size in table.items()}
    if quantity == "angle_rate":
        table = {"rad/s": mpf(1), "deg/d": mpmath.pi / 180 / 86400}
    return table | {"normalized": normal}


QUANTITIES = ["length", "time", "velocity", "acceleration", "energy", "jacobi_constant", "angle_rate"]


@pytest.mark.parametrize("quantity", QUANTITIES)
def test_conversions(service, quantity):
    pick = random.Random(quantity)
    with mpmath.workdps(40):
        table = sizes(quantity)
        values = [
            {"quantity": quantity, "value": pick.gauss(0, 1) * 10 ** pick.uniform(-6, 6), "from": given, "to": wanted}
            for given in table
            for wanted in table
            for _ in range(5)
        ]
        answer = service.post("/v1/units/convert", system=SYSTEM, values=values)
        for asked, found in zip(values, answer["values"], strict=True):
            assert {name: found[name] for name in asked} == asked
            exact = mpf(asked["value"]) * table[asked["from"]] / table[asked["to"]]
            assert abs(found["result"] - exact) <= ROUND_OFF * abs(exact), asked


def doubles(count, seed):
    """Finite doubles of every size, from random bits, and the awkward ones."""
    pick = random.Random(seed)
    yield from [0.0, -0.0, 5e-324, 2.2250738585072014e-308, 2.225073858507201e-308, 1.7976931348623157e308, 0.1, 1e23]
    while count:
        (value,) = struct.unpack("<d", pick.randbytes(8))
        if math.isfinite(value):
            count -= 1
            yield value


def bits(value):
    return struct.pack("<d", value)


def test_doubles_come_back_in_their_bits(service):
    given = list(doubles(5000, "doubles"))
    values = [
        {"quantity": "jacobi_constant", "value": value, "from": "normalized", "to": "normalized"} for value in given
    ]
    answer = service.post("/v1/units/convert", system={"mass_parameter": 0.5}, values=values)
    for value, found in zip(given, answer["values"], strict=True):
        assert bits(found["value"]) == bits(value)
        assert bits(found["result"]) == bits(value)


def test_states_come_back_in_their_bits(service):
    pick = random.Random("states")
    states = [
        {
            "time": pick.uniform(-1e3, 1e3),
            "position": [pick.gauss(0, 1) * 10 ** pick.uniform(-12, 4) for _ in range(3)],
            "velocity": [pick.gauss(0, 1) * 10 ** pick.uniform(-12, 4) for _ in range(3)],
        }
        for _ in range(1000)
    ]
    answer = service.post("/v1/frames/convert", system="earth-moon", states=states, to={}, **{"from": {}})
    found = [{name: state[name] for name in ("time", "position", "velocity")} for state in answer["states"]]
    assert found == states
