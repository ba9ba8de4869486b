"""The quick starts of the README, run as they stand there but for the port."""

import os
import re
import subprocess
import sys
from pathlib import Path

import stubs

README = (stubs.ROOT / "README.md").read_text()
PORT = "127.0.0.1:7410"


def output_of(command, **more):
    done = subprocess.run(command, cwd=stubs.ROOT, capture_output=True, text=True, timeout=120, **more)
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_script(engine):
    script = re.search(r"<<'PY'\n(.*?)^PY$", README, re.S | re.M)[1]
    printed = re.search(r"prints the tensions.*?```text\n(.*?)```", README, re.S)[1]
    assert PORT in script
    found = output_of(
        [sys.executable, "-c", script.replace(PORT, engine.address)],
        env=dict(os.environ, PYTHONPATH=str(stubs.FOLDER)),
    )
    assert found == printed


def test_shell(engine):
    block = next(b for b in re.findall(r"```sh\n(.*?)```", README, re.S) if "buf curl" in b)
    block = re.sub(r"^\.venv/bin/pip .*\n", "", block, flags=re.M)
    buf = Path(sys.executable).with_name("buf")
    found = output_of(["bash", "-euo", "pipefail", "-c", block.replace(PORT, engine.address).replace(".venv/bin/buf", str(buf))])
    assert '"contract": "ropewalk.v1"' in found
    assert '"verdict"' in found


def test_pins_are_those_of_the_tests():
    """What the README installs is what was tested."""
    tested = (stubs.ROOT / "tests/python/requirements.txt").read_text()
    named = re.findall(r"\b([a-z][\w-]*==[\d.]+)", README)
    assert named
    for pin in named:
        assert pin in tested, pin


def test_links_lead_somewhere():
    for page in ("README.md", "DEVELOPERS.md"):
        for link in re.findall(r"\]\(([^)#]+)\)", (stubs.ROOT / page).read_text()):
            assert "://" in link or (stubs.ROOT / link).exists(), f"{page}: {link}"
