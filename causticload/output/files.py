"""Files that appear whole or not at all, and folders that one run at a time may write."""

from __future__ import annotations

import contextlib
import errno
import json
import os
import socket
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

from causticload.errors import ResultError

LOCK = ".lock"


def write_whole(path: Path, write: Callable[[Path], Any]) -> None:
    """Write a file under a temporary name beside its place, then move it there.

    Parameters
    ----------
    path : Path
        The file.
    write : callable
        Writes the path that it is given.

    Raises
    ------
    ResultError
        If it cannot be written; the file is then as it was before.
    """
    # The ending stays: some writers choose their format by it.
    temporary = path.with_name(f".{os.getpid()}-{path.name}")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        write(temporary)
        temporary.replace(path)
    except OSError as error:
        raise _cannot_write(path, error) from error
    finally:
        with contextlib.suppress(OSError):
            temporary.unlink(missing_ok=True)


def _cannot_write(path: Path, error: OSError) -> ResultError:
    full = error.errno in (errno.ENOSPC, errno.EDQUOT)
    return ResultError(
        "the disk is full" if full else f"cannot be written: {error.strerror or error}",
        where=str(path),
        hint="Make room and run again with --resume; finished days are kept."
        if full
        else "Check the folder and its permissions, or choose another with --out.",
    )


def write_text(path: Path, text: str) -> None:
    """Write a text file whole.

    Parameters
    ----------
    path : Path
        The file.
    text : str
        UTF-8.
    """
    write_whole(path, lambda p: p.write_text(text, encoding="utf-8", newline="\n"))


def to_json(data: Any) -> str:
    """Write plain records as JSON with a fixed order.

    Parameters
    ----------
    data : object
        Records of numbers, texts, lists and mappings; other things are written as text.

    Returns
    -------
    text : str
        Ends with a line break.
    """
    return json.dumps(data, indent=2, ensure_ascii=False, default=str) + "\n"


@contextlib.contextmanager
def working_in(folder: Path) -> Iterator[Path]:
    """Hold a folder for one run.

    Parameters
    ----------
    folder : Path
        Made if it is not there.

    Yields
    ------
    folder : Path
        The same.

    Raises
    ------
    ResultError
        If another run that is alive holds it.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise _cannot_write(folder, error) from error
    lock = folder / LOCK
    _take(lock, folder)
    try:
        yield folder
    finally:
        with contextlib.suppress(OSError):
            lock.unlink()


def _take(lock: Path, folder: Path) -> None:
    me = json.dumps({"pid": os.getpid(), "host": socket.gethostname()})
    for _ in range(2):
        try:
            handle = os.open(lock, os.O_CREAT | os.O_EXCL | os.O_WRONLY)
        except FileExistsError:
            if _is_alive(lock):
                raise ResultError(
                    "another run is writing here",
                    where=str(folder),
                    hint=f"Wait for it, choose another folder with --out, or delete {lock.name} "
                    "there if that run is gone.",
                ) from None
            lock.unlink(missing_ok=True)
            continue
        except OSError as error:
            raise _cannot_write(lock, error) from error
        with os.fdopen(handle, "w") as file:
            file.write(me)
        return
    raise ResultError("another run has just taken this folder", where=str(folder))


def _is_alive(lock: Path) -> bool:
    """Whether the run that holds a lock may still be alive."""
    try:
        holder = json.loads(lock.read_text())
        pid, host = int(holder["pid"]), str(holder["host"])
    except FileNotFoundError:
        return False
    except (OSError, ValueError, KeyError, TypeError):
        return False  # a lock cut short by a crash holds nothing
    if host != socket.gethostname():
        return True  # another machine's run cannot be asked
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    except PermissionError:
        return True
    return True
