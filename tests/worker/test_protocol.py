"""Requests and errors against the JSON-RPC 2.0 specification, and how a worker ends."""

import json
import os
import signal
import stat
import time
from pathlib import Path

import pytest
from client import Client, scene

from causticload.cli import main


def test_hello_says_who_answers(worker: Client) -> None:
    hello = worker.call("hello")
    assert hello["program"] == "causticload"
    assert hello["protocol"] == 1
    assert hello["process"] == worker.process.pid
    assert {"load", "instant", "year", "cancel"} <= set(hello["methods"])


def test_folder_is_private(worker: Client) -> None:
    folder = Path(worker.call("hello")["folder"])
    assert stat.S_IMODE(folder.stat().st_mode) == 0o700


# Codes and cases of section 5.1 and 7 of the specification.
@pytest.mark.parametrize(
    ("line", "code", "number"),
    [
        ('{"jsonrpc": "2.0", "method": "foobar, "params": "bar", "baz]', -32700, None),
        ('{"jsonrpc": "2.0", "method": 1, "params": "bar"}', -32600, None),
        ("[]", -32600, None),
        ("[1,2,3]", -32600, None),
        ('{"jsonrpc": "2.0", "method": "foobar", "id": "1"}', -32601, "1"),
        ('{"jsonrpc": "1.0", "method": "hello", "id": 4}', -32600, 4),
        ('{"jsonrpc": "2.0", "method": "hello", "params": [1], "id": 5}', -32602, 5),
        ('{"jsonrpc": "2.0", "method": "hello", "id": true}', -32600, None),
        ('{"jsonrpc": "2.0", "method": "instant", "params": {"beam": NaN}, "id": 6}', -32700, None),
        ('{"jsonrpc": "2.0", "method": "hello", "id": 7, "extra": 1}', -32600, 7),
        ('{"jsonrpc": "2.0", "method": "instant", "params": {"beam": -1}, "id": 8}', -32602, 8),
        ('{"jsonrpc": "2.0", "method": "moment", "params": {}, "id": 9}', -32602, 9),
        ('{"jsonrpc": "2.0", "method": "moment", "params": {"episode": "x"}, "id": 9}', -32602, 9),
    ],
)
def test_bad_requests(worker: Client, line: str, code: int, number: object) -> None:
    worker.write(line)
    answer = worker.read()
    assert answer["error"]["code"] == code
    assert answer["id"] == number


def test_a_notification_gets_no_answer(worker: Client) -> None:
    worker.write('{"jsonrpc": "2.0", "method": "hello"}')
    worker.write('{"jsonrpc": "2.0", "method": "no such method"}')
    worker.write('{"jsonrpc": "2.0", "method": "hello", "id": "next"}')
    assert worker.read()["id"] == "next"


def test_unknown_parameter_is_named(worker: Client) -> None:
    error = worker.fail("instant", att="2025-06-21T12:00")
    assert error["code"] == -32602
    assert "'att'" in error["data"]["message"]
    assert "'at'" in error["data"]["hint"]


def test_instant_without_a_scene(worker: Client) -> None:
    error = worker.fail("instant", at="2025-06-21T12:00")
    assert error["data"]["message"] == "nothing is loaded"


@pytest.mark.parametrize(
    "text",
    [
        "[site]\nlatitude = 91.0\nlongitude = 0.0\n[model]\nfiles = ['a.obj']\n",
        "[site]\nlatitude = 51.0\nlongtude = 0.0\n[model]\nfiles = ['a.obj']\n",
        "[site]\nlatitude = 51.0\nlongitude = 0.0\n[model]\nfiles = ['missing.obj']\n",
    ],
)
def test_errors_are_those_of_the_command_line(
    worker: Client, tmp_path: Path, capsys: pytest.CaptureFixture[str], text: str
) -> None:
    file = tmp_path / "wrong.toml"
    file.write_text(text)
    (tmp_path / "a.obj").write_text("o glass\nv 0 0 0\nv 1 0 0\nv 0 0 1\nf 1 2 3\n")
    assert main(["inspect", str(file), "--json"]) == 2
    said = json.loads(capsys.readouterr().out)["error"]
    error = worker.fail("load", study=str(file))
    assert error["message"] == said["message"]
    assert error["data"]["where"] == said["where"]
    assert error["data"]["hint"] == said["hint"]
    assert error["data"]["kind"] == "StudyError"


def gone(path: Path) -> bool:
    """Whether a folder goes within two seconds."""
    until = time.monotonic() + 2.0
    while path.exists() and time.monotonic() < until:
        time.sleep(0.01)
    return not path.exists()


def test_shutdown_ends_it(fresh: Client) -> None:
    folder = Path(fresh.call("hello")["folder"])
    assert fresh.call("shutdown") == {}
    assert fresh.process.wait(5) == 0
    assert gone(folder)


def test_end_of_input_ends_a_year_at_once(fresh: Client, tmp_path: Path) -> None:
    folder = Path(fresh.call("hello")["folder"])
    fresh.call("load", scene=scene(tmp_path / "a.npz", year={"day_stride": 1, "step_minutes": 1}))
    fresh.send("year")
    while "method" not in fresh.read():
        pass
    started = time.monotonic()
    assert fresh.end() == 0
    assert time.monotonic() - started < 1.0  # the year would go on for minutes
    assert gone(folder)


@pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
def test_polite_kill_leaves_no_folder(fresh: Client) -> None:
    folder = Path(fresh.call("hello")["folder"])
    fresh.process.send_signal(signal.SIGTERM)
    assert fresh.process.wait(5) == 0
    assert gone(folder)
