"""Reads requests, hands them to the desk, writes answers: never two long jobs, never in the way.

Three threads: this one reads and answers at once what needs no work; one works off requests in
order; one runs the long job, so that an instant is still answered while a year runs.
"""

from __future__ import annotations

import contextlib
import os
import shutil
import signal
import sys
import tempfile
import threading
import time as clock
import traceback
from collections import deque
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import IO, Any

from causticload.errors import CausticloadError, HostError
from causticload.worker import protocol
from causticload.worker.desk import Desk, LongJob
from causticload.worker.methods import METHODS
from causticload.worker.protocol import Request, RequestError

# Of these only the newest waiting one is worked off.
NEWEST_ONLY = frozenset({"instant"})
LONG = frozenset({"year"})
LEAST_BETWEEN_NOTES_S = 0.1


class Server:
    """Answers one host.

    Parameters
    ----------
    read : text stream
        Requests, one a line.
    write : binary stream
        Answers and notifications, one a line.
    folder : Path
        Private folder for arrays.
    """

    def __init__(self, read: IO[str], write: IO[bytes], folder: Path) -> None:
        self.read, self.write, self.folder = read, write, folder
        self.desk = Desk(folder)
        self._writing = threading.Lock()
        self._waiting: deque[Request] = deque()
        self._changed = threading.Condition()
        self._open: set[int | str] = set()  # ids that have no answer yet
        self._long: tuple[int | str | None, threading.Event] | None = None
        self._ended = False

    def run(self) -> None:
        """Answer until the host closes its end or asks for the end."""
        threading.Thread(target=self._work, daemon=True, name="desk").start()
        for line in self.read:
            if line.strip():
                self._take(line)
            if self._ended:
                return

    # --- reading -----------------------------------------------------------------------------

    def _take(self, line: str) -> None:
        try:
            request = protocol.parse_request(line)
        except HostError as error:
            self._send(protocol.error_line(protocol.identity_of(line), error))
            return
        try:
            self._check(request)
        except HostError as error:
            if request.id is not None:
                self._send(protocol.error_line(request.id, error))
            return
        if request.method in ("hello", "cancel", "shutdown"):
            self._answer(request, lambda: getattr(self, f"_{request.method}")(request))
        elif request.method in LONG:
            self._queue_long(request)
        else:
            self._queue(request)

    def _check(self, request: Request) -> None:
        if request.method not in METHODS:
            raise RequestError(
                f"there is no method {request.method!r}",
                code=protocol.METHOD_NOT_FOUND,
                hint=f"Methods: {', '.join(METHODS)}.",
            )
        protocol.check_params(request.params, METHODS[request.method])
        with self._changed:
            if request.id is not None and request.id in self._open:
                raise RequestError(
                    f"id {request.id!r} waits for its answer already",
                    code=protocol.INVALID_REQUEST,
                    where="id",
                )
            if request.id is not None:
                self._open.add(request.id)

    def _queue(self, request: Request) -> None:
        dropped: list[Request] = []
        with self._changed:
            if request.method in NEWEST_ONLY:
                dropped = [r for r in self._waiting if r.method == request.method]
                for r in dropped:
                    self._waiting.remove(r)
            self._waiting.append(request)
            self._changed.notify()
        for r in dropped:
            self._fail(r, RequestError("a newer request took its place", code=protocol.SUPERSEDED))

    # --- answered at once --------------------------------------------------------------------

    def _hello(self, request: Request) -> dict[str, Any]:
        return self.desk.hello()

    def _cancel(self, request: Request) -> dict[str, Any]:
        """Take a waiting request back, or ask the long job to stop."""
        wanted = request.params["id"]
        with self._changed:
            found = next((r for r in self._waiting if r.id == wanted), None)
            if found:
                self._waiting.remove(found)
            stopping = self._long is not None and self._long[0] == wanted
            if self._long is not None and stopping:
                self._long[1].set()
        if found:
            self._fail(found, _cancelled(), long=found.method in LONG)
        return {"found": bool(found) or stopping}

    def _shutdown(self, request: Request) -> dict[str, Any]:
        self._ended = True
        return {}

    # --- working -----------------------------------------------------------------------------

    def _work(self) -> None:
        while True:
            with self._changed:
                while not self._waiting:
                    self._changed.wait()
                request = self._waiting.popleft()
            method = getattr(self.desk, request.method)
            work = partial(method, **request.params)
            if request.method in LONG:
                self._begin_long(request, work)
            else:
                self._answer(request, work)

    def _queue_long(self, request: Request) -> None:
        with self._changed:
            busy = self._long is not None
            if not busy:
                self._long = (request.id, threading.Event())
        if busy:
            self._fail(
                request,
                RequestError(
                    "a long job runs already",
                    code=protocol.BUSY,
                    hint="Wait for it, or cancel it.",
                ),
            )
            return
        self._queue(request)

    def _begin_long(self, request: Request, prepare: Callable[[], LongJob]) -> None:
        """Fix at the desk what the job works on, then let it leave the desk."""
        stop = self._long[1] if self._long else threading.Event()

        def run(job: LongJob) -> None:
            self._answer(request, lambda: job(self._noter(request), stop), long=True)

        try:
            job = prepare()
        except Exception as error:
            self._fail(request, error, long=True)
            return
        threading.Thread(target=run, args=(job,), daemon=True, name="long job").start()

    def _noter(self, request: Request) -> Callable[[str, int, int], None]:
        """Make what sends the progress of a request, with the time left."""
        started: dict[str, tuple[float, int]] = {}
        last = [0.0]

        def note(stage: str, done: int, total: int) -> None:
            now = clock.monotonic()
            begun, first = started.setdefault(stage, (now, done))
            if done < total and now - last[0] < LEAST_BETWEEN_NOTES_S:
                return
            last[0] = now
            rate = (done - first) / (now - begun) if now > begun else 0.0
            left = (total - done) / rate if rate > 0.0 else None
            self._send(
                protocol.notification_line(
                    "progress",
                    {
                        "id": request.id,
                        "stage": stage,
                        "done": done,
                        "total": total,
                        "seconds_left": left,
                    },
                )
            )

        return note

    # --- writing -----------------------------------------------------------------------------

    def _answer(self, request: Request, work: Callable[[], Any], *, long: bool = False) -> None:
        try:
            line = protocol.answer_line(request.id, work())
        except Exception as error:
            self._fail(request, error, long=long)
            return
        self._close(request, long=long)
        if request.id is not None:
            self._send(line)

    def _fail(self, request: Request, error: Exception, *, long: bool = False) -> None:
        if not isinstance(error, CausticloadError):
            traceback.print_exception(error)
        self._close(request, long=long)
        if request.id is not None:
            self._send(protocol.error_line(request.id, error))

    def _close(self, request: Request, *, long: bool) -> None:
        with self._changed:
            if request.id is not None:
                self._open.discard(request.id)
            if long:
                self._long = None

    def _send(self, line: str) -> None:
        with self._writing:
            try:
                self.write.write(line.encode("utf-8") + b"\n")
                self.write.flush()
            except (OSError, ValueError):  # nobody listens any more
                _leave(self.folder)


def _cancelled() -> RequestError:
    return RequestError("it was cancelled", code=protocol.CANCELLED)


def _leave(folder: Path) -> None:
    """End at once, in the middle of whatever runs; nothing but the folder is left to put away."""
    shutil.rmtree(folder, ignore_errors=True)
    with contextlib.suppress(OSError, ValueError):
        sys.stderr.flush()
    os._exit(0)


def serve() -> None:
    """Answer a host on standard input and output until it closes them."""
    # Whatever a library prints must not get between the answers.
    channel = os.fdopen(os.dup(1), "wb")
    os.dup2(2, 1)
    requests = os.fdopen(os.dup(0), "r", encoding="utf-8", errors="replace", newline="\n")
    folder = Path(tempfile.mkdtemp(prefix="causticload-"))  # made with mode 0700
    for number in (signal.SIGTERM, signal.SIGINT):
        signal.signal(number, lambda *_: _leave(folder))
    try:
        Server(requests, channel, folder).run()
    except Exception:
        traceback.print_exc()
    finally:
        _leave(folder)
