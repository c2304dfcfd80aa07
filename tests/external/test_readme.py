"""The Python that the README shows runs as it stands."""

import re
import subprocess
import sys

import pytest

from conftest import PATIENCE, ROOT

README = ROOT / "README.md"
SHOWN = "http://127.0.0.1:8080"


def snippets():
    return re.findall(r"^```python\n(.*?)^```", README.read_text(), re.DOTALL | re.MULTILINE)


def test_snippets(service, tmp_path):
    if not README.exists():
        pytest.skip("no README")
    shown = snippets()
    assert shown
    for snippet in shown:
        program = snippet.replace(SHOWN, service.url)
        command = [sys.executable, "-W", "error", "-c", program]
        run = subprocess.run(command, cwd=tmp_path, timeout=PATIENCE, capture_output=True, text=True)
        assert run.returncode == 0, run.stderr
