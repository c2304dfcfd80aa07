"""The served OpenAPI document is sound, and damaged requests never get anything that it does not announce."""

import copy
import json
import random

import pytest
from jsonschema import Draft202012Validator
from openapi_spec_validator import validate

from conftest import serve

MUTANTS = 200
# A damaged request may ask for a great deal: the server that gets them allows little.
MODEST = ["--wall-time-ms", "500", "--max-wall-time-ms", "500", "--max-steps", "20000", "--max-sample-values", "100000"]
EXPECTED = [
    "/v1/systems", "/v1/systems/{id}", "/v1/systems/{id}/equilibria", "/v1/equilibria", "/v1/jacobi", "/v1/units/convert",
    "/v1/frames/convert", "/v1/trajectories", "/v1/limits", "/v1/version", "/livez", "/readyz", "/openapi.json", "/docs",
    "/problems/{slug}",
]
JUNK = [
    None, True, False, 0, -1, 1, 0.5, 2**53, -(2**63), 1e308, -1e-320, 1e-30, 1e300, "", "L1", "normalized", "km", "\u0000",
    "\ud83c\udf11" * 50, "../../etc", "NaN", [], [[]], [0.0] * 3, [None], {}, {"": {}}, {"count": 10**12}, [[[[[[[[]]]]]]]],
]


def test_document(contract):
    validate(contract)
    assert contract["openapi"].startswith("3.1")
    assert set(EXPECTED) <= set(contract["paths"])


def operations(contract):
    """Path, operation and example of each operation that takes a body."""
    for path, item in contract["paths"].items():
        operation = item.get("post")
        if operation:
            content = operation["requestBody"]["content"]["application/json"]
            named = content.get("examples") or {"only": {"value": content["example"]}}
            yield path, operation, [example["value"] for example in named.values()]


def validator(contract, schema):
    return Draft202012Validator(schema | {"components": contract["components"]})


def schema_of(contract, operation, status):
    """The announced status that covers this one, and the schema of each media type there."""
    announced = operation["responses"]
    name = next((name for name in (str(status), f"{status // 100}XX", "default") if name in announced), None)
    assert name, f"status {status} is not announced"
    response = announced[name]
    if "$ref" in response:
        response = contract["components"]["responses"][response["$ref"].rsplit("/", 1)[1]]
    return {media: content.get("schema", {}) for media, content in response.get("content", {}).items()}


def check_answer(contract, operation, response):
    assert response.status_code < 500, response.text
    schemas = schema_of(contract, operation, response.status_code)
    media = response.headers["content-type"].split(";")[0]
    assert media in schemas
    body = response.json()
    errors = sorted(validator(contract, schemas[media]).iter_errors(body), key=str)
    assert not errors, errors[0]
    if response.status_code != 200:
        assert media == "application/problem+json"
        assert body["status"] == response.status_code
        assert body["type"].startswith("/problems/") and body["title"] and body["detail"]
        for error in body.get("errors", []):
            assert error["detail"]
            assert error.get("pointer", "/").startswith("/") or error["pointer"] == ""


def places(tree, path=()):
    yield path
    inner = tree.items() if isinstance(tree, dict) else enumerate(tree) if isinstance(tree, list) else ()
    for key, value in inner:
        yield from places(value, (*path, key))


def damaged(example, pick):
    """The example with one to three faults, as bytes."""
    tree = copy.deepcopy(example)
    for _ in range(pick.randint(1, 3)):
        path = pick.choice(list(places(tree)))
        if not path:
            continue
        parent = tree
        for key in path[:-1]:
            parent = parent[key]
        key, fault = path[-1], pick.randrange(6)
        if fault == 0:
            del parent[key]
        elif fault == 1 and isinstance(parent, dict):
            parent[key[:-1] + pick.choice("abcxyz_")] = parent.pop(key)
        elif fault == 2 and isinstance(parent, list):
            parent.extend(copy.deepcopy(parent) * pick.randint(1, 4))
        elif fault == 3 and isinstance(parent[key], float | int) and not isinstance(parent[key], bool):
            parent[key] = pick.choice([-1, 0, 1e-12, 1e12, 1 + 1e-9]) * parent[key]
        else:
            parent[key] = copy.deepcopy(pick.choice(JUNK))
    text = json.dumps(tree).encode()
    if pick.random() < 0.15:
        at = pick.randrange(len(text))
        text = pick.choice([text[:at], text[:at] + pick.randbytes(3) + text[at:], text + text, b"\xef\xbb\xbf" + text])
    return text


def test_examples_run(contract, service):
    """Each published example satisfies its schema, and so does its answer."""
    for path, operation, examples in operations(contract):
        schema = operation["requestBody"]["content"]["application/json"]["schema"]
        for example in examples:
            validator(contract, schema).validate(example)
            response = service.client.post(path, json=example)
            assert response.status_code == 200, response.text
            check_answer(contract, operation, response)


def test_gets_answer_as_announced(contract, service):
    for path, item in contract["paths"].items():
        operation = item.get("get")
        if operation:
            place = path.replace("{id}", "earth-moon").replace("{slug}", "invalid-request")
            response = service.client.get(place)
            assert response.status_code == 200, place
            schemas = schema_of(contract, operation, 200)
            media = response.headers["content-type"].split(";")[0]
            assert media in schemas, place
            if media == "application/json":
                validator(contract, schemas[media]).validate(response.json())
            assert service.client.head(place).status_code == 200, place


def test_damaged_requests(contract, binary, tmp_path):
    """Never a 5xx, always announced, and what is accepted satisfies the published schema."""
    outcomes = set()
    with serve(binary, tmp_path / "log", *MODEST) as modest:
        for path, operation, examples in operations(contract):
            pick = random.Random(path)
            schema = validator(contract, operation["requestBody"]["content"]["application/json"]["schema"])
            for number in range(MUTANTS):
                text = damaged(pick.choice(examples), pick)
                response = modest.client.post(path, content=text, headers={"content-type": "application/json"})
                outcomes.add((path, response.status_code))
                try:
                    check_answer(contract, operation, response)
                    if response.status_code == 200:
                        schema.validate(json.loads(text))
                except Exception as error:
                    raise AssertionError(f"{path}, mutant {number}: {text[:2000]!r}") from error
    for path, _, _ in operations(contract):
        assert {(path, 400), (path, 422)} <= outcomes, path


@pytest.mark.parametrize(
    ("method", "path", "status", "slug"),
    [
        ("GET", "/nowhere", 404, "not-found"),
        ("GET", "/v1/systems/earth-mon", 404, "not-found"),
        ("DELETE", "/v1/jacobi", 405, "method-not-allowed"),
        ("PUT", "/v1/systems", 405, "method-not-allowed"),
    ],
)
def test_failures_of_the_framework_are_problems(service, method, path, status, slug):
    response = service.client.request(method, path)
    assert response.status_code == status
    assert response.headers["content-type"] == "application/problem+json"
    assert response.json()["type"] == f"/problems/{slug}"
    if status == 405:
        assert response.headers["allow"]


def test_wrong_media_types(service):
    body = b'{"system": "earth-moon", "states": []}'
    unsupported = service.client.post("/v1/jacobi", content=body, headers={"content-type": "text/plain"})
    assert unsupported.status_code == 415
    refused = service.client.get("/v1/systems", headers={"accept": "image/png"})
    assert refused.status_code == 406
    for response in (unsupported, refused):
        assert response.headers["content-type"] == "application/problem+json"
