"""One engine for the whole session, and a channel to it."""

import sys
from pathlib import Path

import grpc
import pytest

sys.path.insert(0, str(Path(__file__).parent))

from engine import Engine  # noqa: E402


@pytest.fixture(scope="session")
def engine():
    with Engine() as running:
        yield running


@pytest.fixture(scope="session")
def channel(engine):
    with grpc.insecure_channel(engine.address) as open_channel:
        grpc.channel_ready_future(open_channel).result(timeout=20)
        yield open_channel


@pytest.fixture(scope="session")
def briefs():
    """The folder of example briefs."""
    return Path(__file__).resolve().parents[2] / "client-example/briefs"
