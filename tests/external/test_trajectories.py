"""Propagation against scipy's DOP853 and mpmath's integrator, in rotating axes and in an inertial frame in km."""

import mpmath
import numpy as np
import pytest
from scipy.integrate import solve_ivp

import model

EARTH_MOON = 0.0121505856
CASES = {
    "about the larger": (EARTH_MOON, [0.3, 0.1, 0.05, -0.4, 1.2, 0.3], 8.0),
    "about the smaller": (EARTH_MOON, [1.0, 0.05, 0.02, -0.2, 0.35, 0.1], 3.0),
    "near L2": (EARTH_MOON, [1.16, 0.01, 0.03, 0.01, -0.05, 0.0], 2.5),
    "equal masses": (0.5, [0.1, 0.9, 0.2, 0.3, -0.1, 0.4], 5.0),
    "outside": (0.2, [2.5, 0.0, 0.3, 0.0, -1.9, 0.1], 12.0),
    "backwards": (3.04e-6, [0.99, 0.004, 0.002, 0.01, 0.003, 0.005], -2.0),
}


def propagate(service, mu, state, duration, **options):
    body = {"system": {"mass_parameter": mu}, "initial_states": [model.wire(state)], "duration": duration}
    answer = service.post("/v1/trajectories", **(body | options))
    assert answer["outcome"] == "complete"
    (trajectory,) = answer["trajectories"]
    return trajectory


@pytest.mark.parametrize("case", CASES)
def test_final_state_against_dop853(service, case):
    mu, state, duration = CASES[case]
    found = model.vector(propagate(service, mu, state, duration)["final"])
    tight = model.flow(mu, state, duration).y[:, -1]
    # How much scipy's own answer moves with a looser tolerance measures what it is worth.
    loose = model.flow(mu, state, duration, rtol=1e-11, atol=1e-13).y[:, -1]
    worth = np.abs(loose - tight).max()
    assert worth < 1e-6
    assert np.abs(found - tight).max() <= worth + 1e-12


@pytest.mark.parametrize("case", CASES)
def test_short_arc_against_forty_digits(service, case):
    mu, state, duration = CASES[case]
    arc = 0.05 * duration
    trajectory = propagate(service, mu, state, arc, state_transition_matrix="final")
    exact = model.exact_flow(mu, state, arc)
    error = [abs(mine - theirs) for mine, theirs in zip(model.vector(trajectory["final"]), exact)]
    amplification = np.abs(np.array(trajectory["state_transition_matrix"])).max()
    assert max(error) <= 1e-15 * amplification * max(1, max(map(abs, map(float, exact))))


def norms(found, exact):
    """Of the errors of position and velocity."""
    with mpmath.workdps(40):
        errors = [mpmath.mpf(mine) - theirs for mine, theirs in zip(found, exact)]
        return [float(mpmath.norm(errors[:3])), float(mpmath.norm(errors[3:]))]


@pytest.mark.parametrize("case", CASES)
def test_double_double_and_audit_against_forty_digits(service, case):
    mu, state, duration = CASES[case]
    arc = 0.05 * duration
    exact = model.exact_flow(mu, state, arc)
    fine = model.vector(propagate(service, mu, state, arc, arithmetic="double_double")["final"])
    assert all(abs(mine - theirs) <= np.spacing(abs(mine)) for mine, theirs in zip(fine, exact))
    # At a loose tolerance the error is far above the last digit of the mpmath integration.
    trajectory = propagate(service, mu, state, arc, audit=True, tolerance=1e-9)
    audit = trajectory["evidence"]["audit"]
    found = [audit["position_error"], audit["velocity_error"]]
    assert audit["outcome"] == "complete"
    assert np.allclose(found, norms(model.vector(trajectory["final"]), exact), rtol=1e-6, atol=1e-30)


@pytest.mark.parametrize("case", CASES)
def test_state_transition_matrix(service, case):
    mu, state, duration = CASES[case]
    trajectory = propagate(service, mu, state, duration, state_transition_matrix="final")
    final, matrix = model.flow_with_matrix(mu, np.array(state), duration)
    found = np.array(trajectory["state_transition_matrix"])
    scale = np.abs(matrix).max()
    assert np.abs(found - matrix).max() <= 1e-9 * scale
    assert trajectory["evidence"]["determinant_defect"] < 1e-14 * scale**2


def test_matrices_of_samples_in_an_inertial_frame_and_physical_units(service):
    """T(t) M T(0)^-1 with the frame's own linear map, scaled."""
    mu, state, duration = CASES["about the larger"]
    length, time = 384400.0, 375190.26
    units = {"length": "km", "time": "s"}
    system = {"mass_parameter": mu, "length_km": length, "time_s": time}
    scales = np.array([length] * 3 + [length / time] * 3)

    def turn(angle):
        c, s = np.cos(angle), np.sin(angle)
        rotation, swept = np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]]), np.array([[0, -1, 0], [1, 0, 0], [0, 0, 0]])
        return np.block([[rotation, np.zeros((3, 3))], [rotation @ swept, rotation]])

    start = (turn(0.0) @ state) * scales
    body = {
        "system": system, "units": units, "frame": {"axes": "inertial"}, "initial_states": [model.wire(start)],
        "duration": duration * time, "samples": {"count": 4}, "state_transition_matrix": "samples",
    }
    samples = service.post("/v1/trajectories", **body)["trajectories"][0]["samples"]
    assert len(samples["time"]) == 4
    for instant, matrix in zip(samples["time"], samples["state_transition_matrix"]):
        if instant == 0:
            assert np.allclose(matrix, np.eye(6), atol=1e-14)
            continue
        _, normal = model.flow_with_matrix(mu, np.array(state), instant / time)
        wanted = turn(instant / time) @ normal @ np.linalg.inv(turn(0.0))
        found = np.array(matrix) / scales[:, None] * scales[None, :]
        assert np.abs(found - wanted).max() <= 1e-9 * np.abs(wanted).max()


def test_two_moving_bodies_in_kilometres(service):
    """Newton's law for the two bodies on their circles, nothing rotating, nothing normalised."""
    larger, smaller, separation = 398600.4355, 4902.800118, 384400.0
    mean_motion = np.sqrt((larger + smaller) / separation**3)
    arms = np.array([-smaller, larger]) / (larger + smaller) * separation

    def rate(t, s):
        direction = np.array([np.cos(mean_motion * t), np.sin(mean_motion * t), 0.0])
        gaps = [s[:3] - arm * direction for arm in arms]
        pull = sum(-gm * gap / np.linalg.norm(gap) ** 3 for gm, gap in zip((larger, smaller), gaps))
        return np.concatenate([s[3:], pull])

    start = np.array([90000.0, -150000.0, 40000.0, 1.1, 0.9, 0.2])
    span = 9 * 86400.0
    wanted = solve_ivp(rate, (0, span), start, method="DOP853", rtol=1e-13, atol=1e-9)
    body = {
        "system": {
            "larger": {"name": "A", "gm_km3_s2": larger}, "smaller": {"name": "B", "gm_km3_s2": smaller},
            "separation_km": separation,
        },
        "units": {"length": "km", "time": "s"}, "frame": {"axes": "inertial"},
        "initial_states": [model.wire(start)], "duration": span, "contact": "ignore",
    }
    found = model.vector(service.post("/v1/trajectories", **body)["trajectories"][0]["final"])
    assert np.abs(found - wanted.y[:, -1])[:3].max() < 1e-4
    assert np.abs(found - wanted.y[:, -1])[3:].max() < 1e-9


def test_samples(service):
    mu, state, duration = CASES["equal masses"]
    times = [0.0, 0.1, 1.0, 2.75, duration]
    for asked, wanted in [
        ({"times": times}, times),
        ({"count": 11}, np.linspace(0, duration, 11)),
        ({"interval": 0.4}, np.arange(0, 13) * 0.4),
    ]:
        found = propagate(service, mu, state, duration, samples=asked)["samples"]
        assert found["time"] == pytest.approx(wanted, abs=1e-15)
        solution = model.flow(mu, state, duration, t_eval=np.minimum(found["time"], duration), dense_output=False)
        both = np.hstack([found["position"], found["velocity"]])
        assert np.abs(both - solution.y.T).max() < 1e-9
    steps = propagate(service, mu, state, duration, samples="every_step")["samples"]
    assert steps["time"][0] == 0.0 and steps["time"][-1] == duration
    assert steps["time"] == sorted(set(steps["time"]))


EVENTS = {
    "plane": ({"plane_crossing": {"axis": "y", "value": 0.12}}, lambda mu: lambda t, s: s[1] - 0.12),
    "any plane": (
        {"plane": {"normal": [1.0, 2.0, -0.5], "through": [0.1, 0.0, 0.0]}},
        lambda mu: lambda t, s: (s[0] - 0.1) + 2 * s[1] - 0.5 * s[2],
    ),
    "distance": (
        {"distance": {"body": "larger", "value": 0.3}},
        lambda mu: lambda t, s: model.distances(mu, s[:3])[0] - 0.3,
    ),
    "periapsis": (
        {"periapsis": "larger"},
        lambda mu: lambda t, s: (s[0] + mu) * s[3] + s[1] * s[4] + s[2] * s[5],
    ),
    "apoapsis": (
        {"apoapsis": "larger"},
        lambda mu: lambda t, s: (s[0] + mu) * s[3] + s[1] * s[4] + s[2] * s[5],
    ),
}
SIGNS = {"either": 0, "increasing": 1, "decreasing": -1}
# Apses take no direction: they are where the distance's rate rises or falls through zero.
WATCHED = [(kind, direction) for kind in ("plane", "any plane", "distance") for direction in SIGNS]
WATCHED += [("periapsis", None), ("apoapsis", None)]


@pytest.mark.parametrize(("kind", "direction"), WATCHED)
def test_events(service, kind, direction):
    mu, state, duration = CASES["about the larger"]
    when, function = EVENTS[kind]
    event = {"when": when} | ({"direction": direction} if direction else {})
    sign = SIGNS[direction] if direction else {"periapsis": 1, "apoapsis": -1}[kind]
    watched = function(mu)
    watched.direction = sign
    # Short steps, because scipy looks for changes of sign between the ends of its steps only.
    wanted = model.flow(mu, state, duration, events=watched, max_step=0.02).t_events[0]
    found = propagate(service, mu, state, duration, events=[event | {"name": kind}])["events"]
    assert [one["event"] for one in found] == [0] * len(found)
    assert len(found) >= 2 and len(found) == len(wanted)
    for one, time in zip(found, wanted):
        assert one["time"] == pytest.approx(time, abs=1e-9)
        assert abs(watched(one["time"], model.vector(one))) < 1e-13


def test_stop_and_filter(service):
    """The second crossing of y = 0 with x > 0 ends the flight; scipy's list says which one that is."""
    mu, state, duration = CASES["about the larger"]
    crossing = lambda t, s: s[1]
    solution = model.flow(mu, state, duration, events=crossing, max_step=0.02)
    wanted = [t for t, s in zip(solution.t_events[0], solution.y_events[0]) if s[0] > 0]
    event = {"when": {"plane_crossing": {"axis": "y", "value": 0.0}}, "only": {"axis": "x", "above": 0.0}, "stop_after": 2}
    trajectory = propagate(service, mu, state, duration, events=[event])
    assert trajectory["outcome"] == "stopped_by_event" and trajectory["stopped_by"] == 0
    assert [one["time"] for one in trajectory["events"]] == pytest.approx(wanted[:2], abs=1e-9)
    assert trajectory["final"]["time"] == trajectory["events"][-1]["time"]


def test_contact(service):
    """The first time at the surface, by scipy."""
    mu, radius = EARTH_MOON, 0.0045
    state = [1.0, 0.02, 0.0, 0.0, -0.1, 0.05]
    surface = lambda t, s: model.distances(mu, s[:3])[1] - radius
    surface.terminal = True
    solution = model.flow(mu, state, 5.0, events=surface, max_step=0.01)
    body = {"system": {"mass_parameter": mu, "radius_larger": 0.0166, "radius_smaller": radius}}
    trajectory = propagate(service, mu, state, 5.0, **body)
    assert len(solution.t_events[0]) == 1 and trajectory["outcome"] == "contact_smaller"
    assert trajectory["final"]["time"] == pytest.approx(solution.t_events[0][0], abs=1e-10)
    assert model.distances(mu, trajectory["final"]["position"])[1] == pytest.approx(radius, rel=1e-13)


def test_manoeuvres(service):
    """Two arcs of scipy's with the change of velocity between them, in the frame and along the velocity."""
    mu, state, duration = CASES["equal masses"]
    instant, change = 1.3, np.array([0.02, -0.05, 0.01])
    before = model.flow(mu, state, instant).y[:, -1]
    r, v = before[:3], before[3:]
    unit = lambda vector: vector / np.linalg.norm(vector)
    triad = np.array([unit(v), unit(np.cross(r, v)), unit(np.cross(v, np.cross(r, v)))])
    for axes, kick in [("frame", change), ("velocity_normal_binormal", change @ triad)]:
        after = before + np.concatenate([np.zeros(3), kick])
        wanted = model.flow(mu, after, duration - instant).y[:, -1]
        burn = {"time": instant, "delta_v": list(change), "axes": axes}
        found = model.vector(propagate(service, mu, state, duration, manoeuvres=[burn])["final"])
        assert np.abs(found - wanted).max() < 1e-9, axes


def test_many_at_once_are_each_as_alone(service):
    mu = EARTH_MOON
    pick = np.random.default_rng(20)
    states = [[0.4 + 0.1 * a, 0.1 * b, 0.05 * c, 0.1 * d, 1.0, 0.0] for a, b, c, d in pick.uniform(-1, 1, (50, 4))]
    durations = list(pick.uniform(0.5, 4.0, 50))
    body = {"system": {"mass_parameter": mu}, "initial_states": [model.wire(state) for state in states]}
    together = service.post("/v1/trajectories", **body, duration=durations)["trajectories"]
    for index in (0, 17, 49):
        alone = propagate(service, mu, states[index], durations[index])
        assert alone["final"] == together[index]["final"]
        wanted = model.flow(mu, states[index], durations[index]).y[:, -1]
        assert np.abs(model.vector(alone["final"]) - wanted).max() < 1e-8


def test_jacobi_drift_is_what_mpmath_finds(service):
    """The constant at both ends, from the doubles that the answer gives."""
    mu, state, duration = CASES["outside"]
    trajectory = propagate(service, mu, state, duration)
    with mpmath.workdps(40):
        ends = []
        for components in (state, model.vector(trajectory["final"])):
            place, velocity = ([mpmath.mpf(float(c)) for c in part] for part in (components[:3], components[3:]))
            ends.append(mpmath.fsum(model.jacobi_terms(mpmath.mpf(mu), place, velocity, mpmath.sqrt)))
        assert abs(ends[1] - ends[0]) < 1e-13
    assert 0 <= trajectory["evidence"]["jacobi_drift"] < 1e-13
