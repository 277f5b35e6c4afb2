"""A small client of the worker for tests: one process, requests and answers in order."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np


class Client:
    """Talks to a worker of its own."""

    def __init__(self, log: Path) -> None:
        self.log = log
        with log.open("wb") as errors:
            self.process = subprocess.Popen(
                [sys.executable, "-u", "-m", "causticload.worker"],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=errors,
                cwd=log.parent,
            )
        self.number = 0
        self.notes: list[dict[str, Any]] = []
        self.answers: dict[Any, dict[str, Any]] = {}

    def write(self, line: str) -> None:
        assert self.process.stdin
        self.process.stdin.write(line.encode() + b"\n")
        self.process.stdin.flush()

    def read(self) -> dict[str, Any]:
        """The next line, whatever it is."""
        assert self.process.stdout
        line = self.process.stdout.readline()
        assert line, self.log.read_text()
        data = json.loads(line)
        assert data.pop("jsonrpc") == "2.0"
        return data

    def send(self, method: str, **params: Any) -> int:
        self.number += 1
        self.write(
            json.dumps({"jsonrpc": "2.0", "id": self.number, "method": method, "params": params})
        )
        return self.number

    def wait(self, number: int) -> dict[str, Any]:
        """The answer to a request; others are kept."""
        while number not in self.answers:
            data = self.read()
            if "id" in data:
                self.answers[data["id"]] = data
            else:
                self.notes.append(data)
        return self.answers.pop(number)

    def call(self, method: str, **params: Any) -> Any:
        answer = self.wait(self.send(method, **params))
        assert "result" in answer, answer
        return answer["result"]

    def fail(self, method: str, **params: Any) -> dict[str, Any]:
        answer = self.wait(self.send(method, **params))
        assert "error" in answer, answer
        return answer["error"]

    def end(self) -> int:
        assert self.process.stdin
        assert self.process.stdout
        self.process.stdin.close()
        code = self.process.wait(20)
        self.process.stdout.close()
        return code


def trough(segments: int = 24, *, radius: float = 30.0, height: float = 6.0) -> Any:
    """A glazed wall bent to a third of a circle about the vertical, hollow to the south.

    Returns vertices (v, 3) and triangles (t, 3); its foot is 4 m above the ground.
    """
    a = np.radians(np.linspace(30.0, 150.0, segments + 1))
    x, y = radius * np.cos(a), radius * np.sin(a)
    low = np.stack([x, y, np.full_like(x, 4.0)], axis=1)
    high = low + [0.0, 0.0, height]
    vertices = np.concatenate([low, high])
    n = segments + 1
    i = np.arange(segments)
    # Seen from the south (from inside) the corners run anticlockwise.
    first = np.stack([i, i + n, i + 1], axis=1)
    second = np.stack([i + 1, i + n, i + 1 + n], axis=1)
    return vertices, np.concatenate([first, second]).astype(np.uint32)


def square(half: float, z: float = 0.0) -> Any:
    """A level square about the origin, facing up."""
    v = np.array([[-half, -half, z], [half, -half, z], [half, half, z], [-half, half, z]])
    return v, np.array([[0, 1, 2], [0, 2, 3]], np.uint32)


SITE = {"latitude": 51.5, "longitude": -1.0, "timezone": "Europe/London"}


def write_arrays(path: Path, shapes: dict[str, Any]) -> str:
    arrays = {}
    for k, (vertices, triangles) in enumerate(shapes.values()):
        arrays[f"v{k}"], arrays[f"t{k}"] = vertices, triangles
    np.savez(path, **arrays)
    return str(path)


def scene(path: Path, *, spacing: float = 0.5, half: float = 25.0, **tables: Any) -> dict[str, Any]:
    """A host's scene: the trough above a yard."""
    shapes = {"Glass [bow]": trough(), "Yard": square(half)}
    rules = [
        {"role": "reflector", "form": "smooth", "finish": "polished stainless steel"},
        {"role": ["receiver"], "spacing": spacing, "kind": "walkway"},
    ]
    return {
        "arrays": write_arrays(path, shapes),
        "objects": [
            {"name": name, "vertices": f"v{k}", "triangles": f"t{k}", "rule": rules[k]}
            for k, name in enumerate(shapes)
        ],
        "study": {"title": "Bow", "site": SITE, **tables},
    }
