"""The server under test and a client of it."""

import contextlib
import json
import os
import pathlib
import signal
import subprocess
import time

import httpx
import pytest

ROOT = pathlib.Path(__file__).resolve().parents[2]
# Patience with a start, a stop and an answer, s: a machine busy with other work is slow, a hang is for ever.
PATIENCE = 60


def pytest_addoption(parser):
    parser.addoption("--binary", default=str(ROOT / "target/release/synodia"), help="the program to check")


def started(log, process):
    """The line that the server logs once it listens."""
    deadline = time.monotonic() + PATIENCE
    while time.monotonic() < deadline and process.poll() is None:
        for line in log.read_text().splitlines():
            entry = json.loads(line)
            if entry.get("message") == "serving":
                return entry
        time.sleep(0.02)
    raise AssertionError(f"the server does not serve: {log.read_text()}")


@contextlib.contextmanager
def serve(binary, log, *flags):
    """A server on a free port, stopped in the end as an orchestrator would; logs no panic meanwhile."""
    environment = {name: value for name, value in os.environ.items() if not name.startswith("SYNODIA_")}
    command = [binary, "serve", "--listen", "127.0.0.1:0", "--log-format", "json", *flags]
    with log.open("w") as stderr:
        process = subprocess.Popen(command, stderr=stderr, env=environment)
    try:
        with httpx.Client(base_url=f"http://{started(log, process)['address']}", timeout=PATIENCE) as client:
            yield Service(client)
        process.send_signal(signal.SIGTERM)
        assert process.wait(PATIENCE) == 0
    finally:
        process.kill()
        process.wait()
    errors = [line for line in log.read_text().splitlines() if json.loads(line).get("level") == "ERROR"]
    assert not errors, errors


class Service:
    """Calls that have to succeed, and the client for those that need not."""

    def __init__(self, client):
        self.client = client

    @property
    def url(self):
        return str(self.client.base_url).rstrip("/")

    def get(self, path, **parameters):
        return self.answer(self.client.get(path, params=parameters))

    def post(self, path, **members):
        return self.answer(self.client.post(path, json=members))

    @staticmethod
    def answer(response):
        assert response.status_code == 200, response.text
        return response.json()


@pytest.fixture(scope="session")
def binary(pytestconfig):
    return str(pathlib.Path(pytestconfig.getoption("binary")).resolve())


@pytest.fixture(scope="session")
def service(binary, tmp_path_factory):
    with serve(binary, tmp_path_factory.mktemp("server") / "log") as service:
        yield service


@pytest.fixture(scope="session")
def contract(service):
    """The OpenAPI document as served."""
    return service.get("/openapi.json")
