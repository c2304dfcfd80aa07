"""The same request gives the same bytes, alone and under load, and says so in its digest."""

import base64
import concurrent.futures
import hashlib
import json

import httpx
import pytest

import model

ROUNDS, WORKERS = 25, 8


def requests():
    system = {"mass_parameter": 0.0121505856}
    states = [model.wire([0.3 + 0.01 * index, 0.1, 0.05, -0.4, 1.2, 0.3]) for index in range(40)]
    event = {"when": {"periapsis": "larger"}}
    yield "/v1/trajectories", {
        "system": system, "initial_states": states, "duration": 3.0, "samples": {"count": 20},
        "events": [event], "state_transition_matrix": "final",
    }
    yield "/v1/jacobi", {"system": "sun-jupiter", "states": states}
    yield "/v1/equilibria", {"systems": [{"mass_parameter": 0.5 / (1 + index)} for index in range(200)]}
    yield "/v1/frames/convert", {
        "system": system, "states": states, "from": {}, "to": {"frame": {"axes": "inertial"}, "elements_about": "larger"}
    }
    values = [{"quantity": "length", "value": 0.1 * index, "from": "au", "to": "km"} for index in range(50)]
    yield "/v1/units/convert", {"system": "earth-moon", "values": values}


REQUESTS = dict(requests())


def digest(body):
    return f"sha-256=:{base64.b64encode(hashlib.sha256(body).digest()).decode()}:"


@pytest.fixture(scope="module")
def bodies(service):
    """Every request many times over from many connections at once, in a mixed order."""
    plain = {"accept-encoding": "identity"}
    texts = {path: json.dumps(body).encode() for path, body in REQUESTS.items()}

    def ask(client, path):
        answer = client.post(path, content=texts[path], headers=plain | {"content-type": "application/json"})
        return path, answer

    with httpx.Client(base_url=service.url, timeout=60) as client, concurrent.futures.ThreadPoolExecutor(WORKERS) as pool:
        alone = dict(ask(client, path) for path in texts)
        crowd = list(pool.map(lambda path: ask(client, path), list(texts) * ROUNDS))
    return alone, crowd


@pytest.mark.parametrize("path", REQUESTS)
def test_bytes_under_load(bodies, path):
    alone, crowd = bodies
    assert alone[path].status_code == 200, alone[path].text
    answers = [answer for other, answer in crowd if other == path]
    assert len(answers) == ROUNDS
    for answer in answers:
        assert answer.status_code == 200, answer.text
        assert answer.content == alone[path].content


@pytest.mark.parametrize("path", REQUESTS)
def test_digest(bodies, path):
    """RFC 9530 over the bytes as they came."""
    answer = bodies[0][path]
    assert answer.headers["repr-digest"] == digest(answer.content)


@pytest.mark.parametrize("path", ["/v1/systems", "/v1/systems/earth-moon/equilibria", "/openapi.json"])
def test_validators(service, path):
    """What depends on the build alone has a strong ETag that If-None-Match is held against."""
    first = service.client.get(path, headers={"accept-encoding": "identity"})
    assert first.status_code == 200 and first.headers["repr-digest"] == digest(first.content)
    tag = first.headers["etag"]
    assert tag.startswith('"')
    again = service.client.get(path, headers={"accept-encoding": "identity", "if-none-match": tag})
    assert again.status_code == 304 and not again.content
