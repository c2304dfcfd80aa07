"""States between frames, variables and elements, against mpmath from the definitions."""

import itertools
import random

import mpmath
import numpy as np
import pytest
from mpmath import mpf

MU = 0.0121505856
AXES = ["rotating", "inertial"]
ORIGINS = ["barycenter", "larger", "smaller"]
SENSES = ["toward_smaller", "toward_larger"]
FRAMES = [dict(zip(("axes", "origin", "x_axis"), choice)) for choice in itertools.product(AXES, ORIGINS, SENSES)]
ROUND_OFF = 2e-15


def turned(angle, vector):
    x, y, z = vector
    sine, cosine = mpmath.sin(angle), mpmath.cos(angle)
    return [cosine * x - sine * y, sine * x + cosine * y, z]


def body(mu, origin):
    return {"barycenter": mpf(0), "larger": -mpf(mu), "smaller": 1 - mpf(mu)}[origin]


def moved(mu, state, frame):
    """A state of the default frame, lists of mpf, seen from another frame."""
    x, y, z = state["position"]
    place = [x - body(mu, frame["origin"]), y, z]
    velocity = list(state["velocity"])
    angle = mpmath.pi if frame["x_axis"] == "toward_larger" else mpf(0)
    if frame["axes"] == "inertial":
        # The body itself moves with the axes: relative to it only the lever arm from it counts.
        velocity = [velocity[0] - place[1], velocity[1] + place[0], velocity[2]]
        angle += state["time"]
    return turned(angle, place), turned(angle, velocity)


def samples(seed, count, spread=1.0):
    pick = random.Random(seed)
    for _ in range(count):
        yield {
            "time": pick.uniform(-20, 20),
            "position": [pick.gauss(0, spread) for _ in range(3)],
            "velocity": [pick.gauss(0, 1) for _ in range(3)],
        }


def exact(state):
    return {
        "time": mpf(state["time"]),
        "position": [mpf(c) for c in state["position"]],
        "velocity": [mpf(c) for c in state["velocity"]],
    }


def close(found, wanted, scale, bound=ROUND_OFF):
    return all(abs(mine - theirs) <= bound * scale for mine, theirs in zip(found, wanted, strict=True))


@pytest.mark.parametrize("frame", FRAMES, ids=lambda frame: "-".join(frame.values()))
def test_frames_both_ways(service, frame):
    states = list(samples(str(frame), 20))
    there = service.post("/v1/frames/convert", system={"mass_parameter": MU}, states=states, **{"from": {}, "to": {"frame": frame}})
    back = service.post(
        "/v1/frames/convert",
        system={"mass_parameter": MU},
        states=[{name: state[name] for name in ("time", "position", "velocity")} for state in there["states"]],
        **{"from": {"frame": frame}, "to": {"frame": {}}},
    )
    with mpmath.workdps(40):
        for given, found, returned in zip(states, there["states"], back["states"], strict=True):
            place, velocity = moved(MU, exact(given), frame)
            scale = 2 + max(map(abs, given["position"] + given["velocity"]))
            assert close(found["position"], place, scale)
            assert close(found["velocity"], velocity, scale)
            assert close(returned["position"], given["position"], scale)
            assert close(returned["velocity"], given["velocity"], 2 * scale)


def test_momenta(service):
    """px = vx - y, py = vy + x, pz = vz; in km and s the mean motion comes in."""
    length, time = 384400.0, 375190.26
    system = {"mass_parameter": MU, "length_km": length, "time_s": time}
    units = {"length": "km", "time": "s"}
    states = [
        {"time": state["time"] * time, "position": [c * length for c in state["position"]],
         "velocity": [c * length / time for c in state["velocity"]]}
        for state in samples("momenta", 20)
    ]
    to = {"units": units, "variables": "momentum"}
    answer = service.post("/v1/frames/convert", system=system, states=states, **{"from": {"units": units}, "to": to})
    with mpmath.workdps(40):
        for given, found in zip(states, answer["states"], strict=True):
            (x, y, _), (u, v, w) = exact(given)["position"], exact(given)["velocity"]
            wanted = [u - y / mpf(time), v + x / mpf(time), w]
            assert close(found["momentum"], wanted, max(map(abs, wanted)), 1e-14)
            assert close(found["position"], given["position"], max(map(abs, given["position"])))


def elements(gm, place, velocity):
    """Osculating elements by the vectors of angular momentum, node and eccentricity.

    Bate, Mueller & White 1971, Fundamentals of Astrodynamics, section 2.4.
    """
    r, v = np.array(place), np.array(velocity)
    distance = mpmath.sqrt(r @ r)
    momentum = np.cross(r, v)
    node = np.array([-momentum[1], momentum[0], mpf(0)])
    eccentric = ((v @ v) / gm - 1 / distance) * r - (r @ v) / gm * v
    size = lambda vector: mpmath.sqrt(vector @ vector)
    angle = lambda a, b, behind: turn(mpmath.acos((a @ b) / (size(a) * size(b))), behind)
    turn = lambda value, behind: mpmath.degrees(2 * mpmath.pi - value if behind else value)
    eccentricity = size(eccentric)
    true_anomaly = angle(eccentric, r, r @ v < 0)
    semi_major_axis = 1 / (2 / distance - (v @ v) / gm)
    if eccentricity < 1:
        eccentric_anomaly = 2 * mpmath.atan(
            mpmath.sqrt((1 - eccentricity) / (1 + eccentricity)) * mpmath.tan(mpmath.radians(true_anomaly) / 2)
        )
        mean_anomaly = mpmath.degrees(eccentric_anomaly - eccentricity * mpmath.sin(eccentric_anomaly)) % 360
    else:
        half = mpmath.sqrt((eccentricity - 1) / (eccentricity + 1)) * mpmath.tan(mpmath.radians(true_anomaly) / 2)
        hyperbolic = 2 * mpmath.atanh(half)
        mean_anomaly = mpmath.degrees(eccentricity * mpmath.sinh(hyperbolic) - hyperbolic)
    return {
        "semi_major_axis": semi_major_axis,
        "eccentricity": eccentricity,
        "inclination": mpmath.degrees(mpmath.acos(momentum[2] / size(momentum))),
        "ascending_node": turn(mpmath.acos(node[0] / size(node)), node[1] < 0),
        "argument_of_periapsis": angle(node, eccentric, eccentric[2] < 0),
        "true_anomaly": true_anomaly,
        "mean_anomaly": mean_anomaly,
    }


@pytest.mark.parametrize("about", ["larger", "smaller"])
def test_elements(service, about):
    """Away from circle, parabola and plane, where a naive formula is good; those have tests of their own."""
    mu = 0.2
    gm = mpf(mu) if about == "smaller" else 1 - mpf(mu)
    frame = {"axes": "inertial", "origin": about}
    states = [state | {"velocity": [c * 0.7 for c in state["velocity"]]} for state in samples(about, 60)]
    request = {"from": {"frame": frame}, "to": {"frame": frame, "elements_about": about}}
    answer = service.post("/v1/frames/convert", system={"mass_parameter": mu}, states=states, **request)
    kinds = set()
    with mpmath.workdps(40):
        for given, found in zip(states, answer["states"], strict=True):
            wanted = elements(gm, exact(given)["position"], exact(given)["velocity"])
            # Near the parabola the semi-major axis is as uncertain as the energy.
            slack = 1e-12 * (1 + 1 / abs(1 - wanted["eccentricity"])) * (1 + 1 / wanted["eccentricity"])
            kinds.add(wanted["eccentricity"] < 1)
            for name, value in wanted.items():
                mine = mpf(found["elements"][name])
                if name in ("semi_major_axis", "eccentricity"):
                    assert abs(mine / value - 1) <= slack, name
                else:
                    apart = (mine - value + 180) % 360 - 180
                    assert abs(apart) <= 360 * slack * (1 + abs(value) / 360), (name, mine, value)
            if about == "larger":
                a, e, i = wanted["semi_major_axis"], wanted["eccentricity"], mpmath.radians(wanted["inclination"])
                tisserand = 1 / a + 2 * mpmath.sqrt(a * (1 - e**2)) * mpmath.cos(i)
                assert abs(found["tisserand_parameter"] - tisserand) <= slack * max(1, abs(1 / a), abs(tisserand))
    assert kinds == {True, False}, "ellipses and hyperbolas"


def test_elements_given(service):
    """Kepler's equation solved by mpmath, the state by rotation from the orbit's plane."""
    pick = random.Random("kepler")
    mu = 0.1
    given = [
        {
            "time": pick.uniform(0, 5),
            "elements_about": "larger",
            "elements": {
                "semi_major_axis": pick.uniform(0.2, 3),
                "eccentricity": pick.uniform(0.05, 0.9),
                "inclination": pick.uniform(1, 179),
                "ascending_node": pick.uniform(0, 360),
                "argument_of_periapsis": pick.uniform(0, 360),
                "true_anomaly": pick.uniform(0, 360),
            },
        }
        for _ in range(40)
    ]
    frame = {"axes": "inertial", "origin": "larger"}
    answer = service.post("/v1/frames/convert", system={"mass_parameter": mu}, states=given, **{"from": {"frame": frame}, "to": {"frame": frame}})
    with mpmath.workdps(40):
        gm = 1 - mpf(mu)
        for state, found in zip(given, answer["states"], strict=True):
            named = {name: mpf(value) for name, value in state["elements"].items()}
            a, e = named["semi_major_axis"], named["eccentricity"]
            i, node, periapsis, anomaly = (
                mpmath.radians(named[name])
                for name in ("inclination", "ascending_node", "argument_of_periapsis", "true_anomaly")
            )
            parameter = a * (1 - e**2)
            distance = parameter / (1 + e * mpmath.cos(anomaly))
            flat = [distance * mpmath.cos(anomaly), distance * mpmath.sin(anomaly), mpf(0)]
            speed = mpmath.sqrt(gm / parameter)
            rate = [-speed * mpmath.sin(anomaly), speed * (e + mpmath.cos(anomaly)), mpf(0)]

            def oriented(vector):
                x, y, z = turned(periapsis, vector)
                return turned(node, [x, y * mpmath.cos(i), y * mpmath.sin(i)])

            assert close(found["position"], oriented(flat), distance, 1e-14)
            assert close(found["velocity"], oriented(rate), speed * (1 + e), 1e-14)
