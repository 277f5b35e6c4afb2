"""What a host can ask for, and which parameters each question takes."""

from __future__ import annotations

from causticload.study.schema import FLAG, LIST, NUMBER, TABLE, TEXT, WHOLE, Key, between, one_of

_SUN = {
    "at": Key(TEXT, "local clock time, such as 2026-06-21T13:30"),
    "sun": Key(LIST, "azimuth and elevation in degrees, instead of a time"),
    "beam": Key(NUMBER, "W/m², with sun", between(0.0, 2000.0, open_low=True)),
}
METHODS: dict[str, dict[str, Key]] = {
    "hello": {},
    "vocabulary": {},
    "guess": {"names": Key(LIST, "names of objects", required=True)},
    "load": {
        "study": Key(TEXT, "path of a study file"),
        "scene": Key(TABLE, "a host's own scene"),
        "ground": Key(FLAG, "lay a ground where nothing receives light"),
    },
    "inspect": {},
    "instant": {
        **_SUN,
        "show": Key(TEXT, "what the colours show", one_of("reflected", "total", "images")),
    },
    "year": {
        "out": Key(TEXT, "folder for the results"),
        "threads": Key(WHOLE, "days worked off at once", between(1, 1024)),
        "checks": Key(WHOLE, "seasons whose peak is looked at closely", between(0, 1000)),
    },
    "paint": {
        "show": Key(TEXT, "what the colours show", one_of("peak", "hours", "images")),
        "criterion": Key(TEXT, "whose hours; all if not given"),
    },
    "moment": {
        "episode": Key(WHOLE, "number of an episode of the last year", required=True),
        "show": Key(TEXT, "what the colours show", one_of("reflected", "total", "images")),
    },
    "contributors": {
        "episode": Key(WHOLE, "number of an episode; the last instant's hottest spot if not given")
    },
    "change": {
        "arrays": Key(TEXT, "path of an .npz file", required=True),
        "before": Key(TEXT, "key of an array in it", required=True),
        "after": Key(TEXT, "key of an array in it", required=True),
    },
    "memo": {
        "folder": Key(TEXT, "result folder; the last year's if not given"),
        "formats": Key(LIST, "of docx, pdf, html"),
    },
    "save_study": {
        "path": Key(TEXT, "the study file to write", required=True),
        "overwrite": Key(FLAG, "whether a file there may be replaced"),
    },
    "cancel": {"id": Key("text or whole number", "id of the request", required=True)},
    "shutdown": {},
}
