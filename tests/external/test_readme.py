"""What the README shows is true: its requests are answered as printed, its Python runs as it stands."""

import json
import re
import shlex
import subprocess
import sys

import pytest

from conftest import PATIENCE, ROOT

README = ROOT / "README.md"
SHOWN = "http://127.0.0.1:8080"
BLOCKS = re.findall(r"^```(\w+)\n(.*?)^```", README.read_text(), re.DOTALL | re.MULTILINE)
PAIRS = list(zip(BLOCKS, BLOCKS[1:], strict=False))
PROGRAMS = [(text, following) for (kind, text), following in PAIRS if kind == "python"]
REQUESTS = [(text, answer) for (kind, text), (_, answer) in PAIRS if kind == "sh" and text.startswith("curl ")]


@pytest.mark.parametrize("program, following", PROGRAMS)
def test_python(service, tmp_path, program, following):
    command = [sys.executable, "-W", "error", "-c", program.replace(SHOWN, service.url)]
    run = subprocess.run(command, cwd=tmp_path, timeout=PATIENCE, capture_output=True, text=True)
    assert run.returncode == 0, run.stderr
    kind, printed = following
    assert kind == "text" and run.stdout == printed


def shows(part, whole):
    """Whether `part` leaves out members of objects at most."""
    if isinstance(part, dict):
        return all(name in whole and shows(member, whole[name]) for name, member in part.items())
    if isinstance(part, list):
        return len(part) == len(whole) and all(map(shows, part, whole))
    return part == whole


@pytest.mark.parametrize("command, answer", REQUESTS)
def test_requests(service, command, answer):
    words = shlex.split(command)
    [url] = [word for word in words if word.startswith(SHOWN)]
    body, header = words[words.index("-d") + 1], words[words.index("-H") + 1]
    found = service.client.post(url.removeprefix(SHOWN), content=body, headers=[header.split(": ")]).json()
    assert shows(json.loads(answer), found), found


def test_there_is_something_to_check():
    assert PROGRAMS and len(REQUESTS) >= 3
