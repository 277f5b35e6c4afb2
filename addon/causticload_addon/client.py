"""Talks to the worker: a process, a thread that reads lines, a queue. Never touches bpy."""

import contextlib
import json
import os
import queue
import shutil
import subprocess
import tempfile
import threading


class WorkerLostError(Exception):
    """The worker ended, or cannot be started."""


class Client:
    """One worker process.

    ``python`` is the interpreter that has the engine. Answers come out of ``drain`` as
    ``(kind, number, content)`` with kind "result", "error", "note" or "lost".
    """

    def __init__(self, python):
        self.folder = None  # private folder of the worker, from its hello
        self._log = tempfile.TemporaryFile()  # noqa: SIM115 - closed in stop()
        self._queue = queue.Queue()
        self._number = 0
        self.ended = False
        environment = {k: v for k, v in os.environ.items() if k not in ("PYTHONHOME", "PYTHONPATH")}
        options = {}
        if os.name == "nt":
            options["creationflags"] = (
                subprocess.CREATE_NO_WINDOW | subprocess.CREATE_NEW_PROCESS_GROUP
            )
        else:
            options["start_new_session"] = True
        try:
            self.process = subprocess.Popen(
                [python, "-u", "-m", "causticload.worker"],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=self._log,
                env=environment,
                cwd=tempfile.gettempdir(),  # a folder of the user's may hold a causticload.py
                **options,
            )
        except OSError as error:
            self._log.close()
            raise WorkerLostError(f"{python} cannot be started: {error.strerror}") from None
        self._reader = threading.Thread(target=self._read, daemon=True)
        self._reader.start()

    def _read(self):
        for line in self.process.stdout:
            try:
                data = json.loads(line)
            except ValueError:
                continue
            if "method" in data:
                self._queue.put(("note", data["params"].get("id"), data["params"]))
            elif "error" in data:
                self._queue.put(("error", data.get("id"), data["error"]))
            else:
                self._queue.put(("result", data.get("id"), data["result"]))
        self.process.wait()
        self._queue.put(("lost", None, self.last_words()))

    def last_words(self):
        """The end of what the worker wrote to its log."""
        try:
            self._log.seek(0)
            lines = self._log.read().decode("utf-8", "replace").strip().splitlines()
        except (OSError, ValueError):
            return ""
        return lines[-1] if lines else ""

    def send(self, method, **params):
        """Ask; returns the number of the request."""
        self._number += 1
        request = {"jsonrpc": "2.0", "id": self._number, "method": method, "params": params}
        try:
            self.process.stdin.write(json.dumps(request).encode("utf-8") + b"\n")
            self.process.stdin.flush()
        except (OSError, ValueError):
            raise WorkerLostError(self.last_words() or "the worker has ended") from None
        return self._number

    def drain(self, timeout=0.0):
        """The next answer, or None."""
        try:
            return self._queue.get(timeout=timeout) if timeout else self._queue.get_nowait()
        except queue.Empty:
            return None

    def alive(self):
        return self.process.poll() is None

    def stop(self):
        """Close its input, which ends it at once, also in mid job."""
        self.ended = True
        with contextlib.suppress(OSError):
            self.process.stdin.close()
        try:
            self.process.wait(1.0)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait()
        self._reader.join(1.0)
        self.process.stdout.close()
        self._log.close()
        if self.folder:  # a worker that was killed could not put it away
            shutil.rmtree(self.folder, ignore_errors=True)
