"""JSON-RPC 2.0 as lines of text: requests are checked, answers and errors are made."""

from __future__ import annotations

import dataclasses
import json
import math
from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from difflib import get_close_matches
from pathlib import Path
from typing import Any

import numpy as np

from causticload.errors import CausticloadError, HostError
from causticload.study.schema import FLAG, LIST, NUMBER, TABLE, TEXT, WHOLE, Key

VERSION = 1

# Codes of the JSON-RPC 2.0 specification, section 5.1.
PARSE_ERROR = -32700
INVALID_REQUEST = -32600
METHOD_NOT_FOUND = -32601
INVALID_PARAMS = -32602
FAULT = -32603
# Its range for servers.
WRONG_INPUT = -32000
SUPERSEDED = -32001
CANCELLED = -32002
BUSY = -32003


class RequestError(HostError):
    """A request that cannot be answered.

    Parameters
    ----------
    message : str
        What rule was broken and by which value.
    code : int
        Code of the JSON-RPC error.
    where : str
        Place in the request, such as ``params.at``.
    hint : str
        What to do about it.
    """

    def __init__(self, message: str, *, code: int, where: str = "", hint: str = "") -> None:
        super().__init__(message, where=where, hint=hint)
        self.code = code


@dataclass(frozen=True)
class Request:
    """A checked request. ``id`` is None for a notification, which gets no answer."""

    id: int | str | None
    method: str
    params: dict[str, Any]


def _no_constant(text: str) -> float:
    raise ValueError(f"{text} is not JSON")


def parse_request(line: str) -> Request:
    """Read one line.

    Parameters
    ----------
    line : str
        One JSON object.

    Returns
    -------
    request : Request
        Its method and parameters are not known to exist yet.

    Raises
    ------
    RequestError
        If the line is not a JSON-RPC 2.0 request with named parameters.
    """
    try:
        data = json.loads(line, parse_constant=_no_constant)
    except ValueError as error:
        raise RequestError(f"not JSON: {error}", code=PARSE_ERROR) from None
    if not isinstance(data, dict):
        raise RequestError(
            "a line must hold one request object; batches are not taken", code=INVALID_REQUEST
        )
    number = data.get("id")
    usable = number is None or (isinstance(number, (int, str)) and not isinstance(number, bool))
    if data.get("jsonrpc") != "2.0" or not isinstance(data.get("method"), str) or not usable:
        raise RequestError(
            'a request has "jsonrpc": "2.0", a "method" and, as "id", a text or a whole number',
            code=INVALID_REQUEST,
        )
    strange = set(data) - {"jsonrpc", "id", "method", "params"}
    if strange:
        raise RequestError(f"unknown key {min(strange)!r}", code=INVALID_REQUEST, where="request")
    params = data.get("params", {})
    if not isinstance(params, dict):
        raise RequestError(
            "parameters go by name, in an object", code=INVALID_PARAMS, where="params"
        )
    return Request(number, data["method"], params)


def identity_of(line: str) -> int | str | None:
    """Read the id of a line that is not a good request, so that its error can be told apart.

    Parameters
    ----------
    line : str
        Any text.

    Returns
    -------
    id : int, str or None
        None if there is none to be found.
    """
    try:
        number = json.loads(line, parse_constant=_no_constant).get("id")
    except (ValueError, AttributeError):
        return None
    return number if isinstance(number, (int, str)) and not isinstance(number, bool) else None


def check_params(
    params: Mapping[str, Any], keys: Mapping[str, Key], *, where: str = "params"
) -> None:
    """Hold parameters against what a method takes.

    Parameters
    ----------
    params : mapping
        As they came.
    keys : mapping of str to Key
        What is known.
    where : str
        Name of the place, for errors.

    Raises
    ------
    RequestError
        At the first that is unknown, missing, of the wrong kind or out of range.
    """
    for name in params:
        if name not in keys:
            near = get_close_matches(name, keys, n=1)
            known = f"Known here: {', '.join(keys) or 'none'}."
            raise RequestError(
                f"unknown key {name!r}",
                code=INVALID_PARAMS,
                where=where,
                hint=f"Did you mean {near[0]!r}?" if near else known,
            )
    for name, key in keys.items():
        place = f"{where}.{name}"
        if name not in params:
            if key.required:
                raise RequestError(
                    f"it is missing ({key.meaning})", code=INVALID_PARAMS, where=place
                )
            continue
        value = params[name]
        if not _is_kind(value, key.kind):
            raise RequestError(
                f"must be a {key.kind} ({key.meaning}), got {value!r}",
                code=INVALID_PARAMS,
                where=place,
            )
        wrong = key.check(value) if key.check else None
        if wrong:
            raise RequestError(wrong, code=INVALID_PARAMS, where=place)


def _is_kind(value: Any, kind: str) -> bool:
    whole = isinstance(value, int) and not isinstance(value, bool)
    tests = {
        NUMBER: whole or isinstance(value, float),
        WHOLE: whole,
        TEXT: isinstance(value, str),
        FLAG: isinstance(value, bool),
        LIST: isinstance(value, list),
        TABLE: isinstance(value, dict),
        "text or whole number": whole or isinstance(value, str),
    }
    return tests[kind]


def to_plain(value: Any) -> Any:
    """Turn results into what JSON can hold; what is not a finite number becomes null.

    Parameters
    ----------
    value : object
        Records, mappings, lists, numbers, texts, times, paths.

    Returns
    -------
    plain : object
        Mappings, lists, numbers, texts, true, false, null.
    """
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {f.name: to_plain(getattr(value, f.name)) for f in dataclasses.fields(value)}
    if isinstance(value, Mapping):
        return {str(k): to_plain(v) for k, v in value.items()}
    if isinstance(value, (list, tuple, set, frozenset, np.ndarray)):
        return [to_plain(v) for v in value]
    if isinstance(value, np.datetime64):
        return None if np.isnat(value) else f"{value.astype('datetime64[s]')}Z"
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, Path):
        return str(value)
    return value


def answer_line(number: int | str | None, result: Any) -> str:
    """Write an answer.

    Parameters
    ----------
    number : int, str or None
        Id of the request.
    result : object
        What came of it.

    Returns
    -------
    line : str
        Without a line break.
    """
    return _line({"id": number, "result": to_plain(result)})


def notification_line(method: str, params: Mapping[str, Any]) -> str:
    """Write a notification.

    Parameters
    ----------
    method : str
        Its name.
    params : mapping
        What it says.

    Returns
    -------
    line : str
        Without a line break.
    """
    return _line({"method": method, "params": to_plain(params)})


def error_line(number: int | str | None, error: BaseException) -> str:
    """Write an error, in the words that the command line would use.

    Parameters
    ----------
    number : int, str or None
        Id of the request.
    error : exception
        What was raised.

    Returns
    -------
    line : str
        Without a line break.
    """
    if isinstance(error, CausticloadError):
        code = error.code if isinstance(error, RequestError) else WRONG_INPUT
        message, where, hint = error.message, error.where, error.hint
    else:
        code, where, hint = FAULT, "", ""
        message = f"Fault of the program: {type(error).__name__}: {error}."
    text = str(error) if isinstance(error, CausticloadError) else message
    data = {"kind": type(error).__name__, "message": message, "where": where, "hint": hint}
    return _line({"id": number, "error": {"code": code, "message": text, "data": data}})


def _line(content: Mapping[str, Any]) -> str:
    return json.dumps({"jsonrpc": "2.0", **content}, ensure_ascii=False, allow_nan=False)
