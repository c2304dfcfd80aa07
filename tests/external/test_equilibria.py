"""The five points and their linear motion against mpmath, worked at 90 digits."""

import mpmath
import pytest
from mpmath import mpf

import model

DIGITS = 90
# Relative error allowed: two units of round-off for lengths, as promised for eigenvalues.
LENGTH, EIGENVALUE = 4e-16, 1e-13
MASS_PARAMETERS = sorted(
    [10.0**-power for power in range(1, 17)]
    + [3.0403e-6, 9.5388e-4, 1.2150584e-2, 2.4e-2, 3.85e-2, 3.86e-2, 0.108774, 0.3, 0.49999, 0.5]
)
NAMES = ["L1", "L2", "L3", "L4", "L5"]


def collinear(mu, name):
    """x and the distances to both primaries, from the balance of forces along the axis."""
    larger, smaller, start = {
        "L1": (1, -1, (mu / 3) ** (mpf(1) / 3)),
        "L2": (1, 1, (mu / 3) ** (mpf(1) / 3)),
        "L3": (-1, -1, 1 - 7 * mu / 12),
    }[name]

    def split(unknown):
        """(distance to the larger, to the smaller) from that to the nearer one."""
        return (unknown, 1 + unknown) if name == "L3" else (1 + smaller * unknown, unknown)

    def imbalance(unknown):
        r1, r2 = split(unknown)
        return larger * r1 - mu - larger * (1 - mu) / r1**2 - smaller * mu / r2**2

    root = mpmath.findroot(imbalance, (start * mpf("0.99"), start), solver="secant", maxsteps=100)
    r1, r2 = split(root)
    return larger * r1 - mu, r1, r2


def expected(mu, name):
    if name in ("L4", "L5"):
        side = mpmath.sqrt(3) / 2
        place, r1, r2 = [mpf(1) / 2 - mu, side if name == "L4" else -side, mpf(0)], mpf(1), mpf(1)
    else:
        x, r1, r2 = collinear(mu, name)
        place = [x, mpf(0), mpf(0)]
    values, _ = mpmath.eig(mpmath.matrix(model.linear(mu, place, mpmath.sqrt)))
    clean = lambda part: mpf(0) if abs(part) < mpf(10) ** -40 else part
    values = [mpmath.mpc(clean(value.real), clean(value.imag)) for value in values]
    constant = mpmath.fsum(model.jacobi_terms(mu, place, [mpf(0)] * 3, mpmath.sqrt))
    return place, r1, r2, constant, values


def relative(found, wanted):
    return abs(found - wanted) / abs(wanted) if wanted else abs(mpf(found))


@pytest.fixture(scope="module")
def answers(service):
    body = {"systems": [{"mass_parameter": mu} for mu in MASS_PARAMETERS]}
    answer = service.post("/v1/equilibria", **body)
    systems = answer["systems"]
    assert len(systems) == len(MASS_PARAMETERS)
    return {mu: {point["name"]: point for point in system["points"]} for mu, system in zip(MASS_PARAMETERS, systems)}


@pytest.mark.parametrize("mu", MASS_PARAMETERS)
def test_points_and_linear_motion(answers, mu):
    assert list(answers[mu]) == NAMES
    with mpmath.workdps(DIGITS):
        for name in NAMES:
            found = answers[mu][name]
            place, r1, r2, constant, values = expected(mpf(mu), name)
            assert relative(found["distance_to_larger"], r1) <= LENGTH, name
            assert relative(found["distance_to_smaller"], r2) <= LENGTH, name
            for mine, theirs in zip(found["position"], place):
                assert abs(mine - theirs) <= LENGTH, name
            assert relative(found["jacobi_constant"], constant) <= LENGTH, name
            assert found["energy"] == -found["jacobi_constant"] / 2
            check_eigenvalues(found["linear"], values, name)


def check_eigenvalues(found, values, name):
    eigenvalues = [mpmath.mpc(*pair) for pair in found["eigenvalues"]]
    order = [tuple(pair) for pair in found["eigenvalues"]]
    assert order == sorted(order, reverse=True), name
    left = list(values)
    for mine in eigenvalues:
        nearest = min(left, key=lambda theirs: abs(theirs - mine))
        left.remove(nearest)
        for part in ("real", "imag"):
            assert relative(getattr(mine, part), getattr(nearest, part)) <= EIGENVALUE, (name, part)
    growth = max(value.real for value in values)
    assert relative(found["growth_rate"], growth) <= EIGENVALUE, name
    assert found["stable"] == (growth == 0), name
    oscillating = [value for value in values if value.imag > 0]
    # Every point swings across the plane at its own rate; the rest of the oscillations is in the plane.
    vertical = 2 * mpmath.pi / mpf(found["vertical_period"])
    nearest = min(oscillating, key=lambda value: abs(value - mpmath.mpc(0, vertical)))
    assert relative(vertical, nearest.imag) <= 2 * EIGENVALUE, name
    oscillating.remove(nearest)
    periods = sorted((2 * mpmath.pi / value.imag for value in oscillating), reverse=True)
    if found["growth_rate"] > 0 and name in ("L4", "L5"):
        periods = periods[:1]
    assert len(found["in_plane_periods"]) == len(periods), name
    for mine, theirs in zip(found["in_plane_periods"], periods):
        assert relative(mine, theirs) <= 2 * EIGENVALUE, name


def test_routh_value(service):
    """Routh 1875: (1 - sqrt(69)/9)/2."""
    answer = service.post("/v1/equilibria", system={"mass_parameter": 0.01})
    with mpmath.workdps(DIGITS):
        assert relative(answer["critical_mass_parameter"], (1 - mpmath.sqrt(69) / 9) / 2) <= LENGTH


def test_symmetric_form_and_kilometres(service):
    """C + mu(1 - mu) of L4 is 3 exactly; lengths times the separation; constants times the velocity squared."""
    system = service.get("/v1/systems/earth-moon")
    mu, length, speed = system["mass_parameter"], system["length_km"], system["velocity_km_s"]
    plain = service.get("/v1/systems/earth-moon/equilibria")
    other = service.get(
        "/v1/systems/earth-moon/equilibria", length="km", time="s", jacobi_form="symmetric", origin="smaller"
    )
    for normal, physical in zip(plain["points"], other["points"]):
        wanted = (normal["jacobi_constant"] + mu * (1 - mu)) * speed**2
        assert physical["jacobi_constant"] == pytest.approx(wanted, rel=1e-15)
        x, y, _ = normal["position"]
        assert physical["position"] == pytest.approx([(x - 1 + mu) * length, y * length, 0], rel=1e-14, abs=1e-9)
        assert physical["distance_to_smaller"] == pytest.approx(normal["distance_to_smaller"] * length, rel=1e-15)
    assert other["points"][3]["jacobi_constant"] == pytest.approx(3 * speed**2, rel=1e-15)
