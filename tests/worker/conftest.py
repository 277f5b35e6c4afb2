"""The helpers beside these tests, and a worker that several tests may share."""

import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from client import Client


@pytest.fixture(scope="module")
def worker(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Client]:
    client = Client(tmp_path_factory.mktemp("worker") / "log.txt")
    yield client
    assert client.end() == 0
    # Nothing but a fault of the program writes a traceback there.
    assert "Traceback" not in client.log.read_text()


@pytest.fixture
def fresh(tmp_path: Path) -> Iterator[Client]:
    client = Client(tmp_path / "log.txt")
    yield client
    client.process.kill()
    client.end()
