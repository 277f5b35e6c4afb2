"""The one worker of this Blender: started when asked, drained by a timer, stopped on leaving.

A job remembers the file and the scene that it belongs to; its answer is dropped if another file
is open by then.
"""

import time

import bpy

from . import client, preferences

TICK_S = 0.05
BUDGET_S = 0.02

_state = {
    "client": None,
    "hello": None,
    "vocabulary": None,
    "text": "not started",
    "jobs": {},
    "file": 0,
}


class Job:
    """What is done with an answer, and where it belongs."""

    def __init__(self, method, scene, done, note=None):
        self.method, self.done, self.note = method, done, note
        self.file, self.scene = _state["file"], scene.name if scene else ""
        self.started = time.monotonic()
        self.message = ""

    def scene_now(self):
        """The scene it belongs to; None if it is no longer there."""
        if _state["file"] != self.file:
            return None
        return bpy.data.scenes.get(self.scene)


def another_file():
    """Note that another file is open: answers to the last one's questions are dropped."""
    _state["file"] += 1


def state_text():
    return _state["text"]


def hello():
    return _state["hello"]


def vocabulary():
    return _state["vocabulary"]


def jobs():
    return _state["jobs"]


def running(method):
    """Number of a job of this kind that waits for its answer, or None."""
    return next((n for n, job in _state["jobs"].items() if job.method == method), None)


def start():
    """Start the worker if it does not run; raises ``client.WorkerLostError``."""
    if _state["client"] is not None and _state["client"].alive():
        return _state["client"]
    stop()
    python = preferences.interpreter()
    if not python:
        raise client.WorkerLostError("the engine's Python is not set: see the add-on's preferences")
    _state["client"] = client.Client(python)
    _state["text"] = "starting"
    ask("hello", None, _greeted)
    ask("vocabulary", None, lambda job, answer: _state.update(vocabulary=answer))
    if not bpy.app.timers.is_registered(tick):
        bpy.app.timers.register(tick, first_interval=TICK_S, persistent=True)
    return _state["client"]


def _greeted(job, answer):
    _state["hello"] = answer
    if _state["client"] is not None:
        _state["client"].folder = answer["folder"]
    _state["text"] = f"causticload {answer['version']}, Python {answer['python']}"


def ask(method, scene, done, note=None, /, **params):
    """Send a request; ``done(job, answer)`` is called from the timer. Returns its number."""
    worker = _state["client"] if _state["client"] is not None else start()
    number = worker.send(method, **params)
    _state["jobs"][number] = Job(method, scene, done, note)
    return number


def cancel(number):
    if _state["client"] is not None:
        ask("cancel", None, lambda job, answer: None, id=number)


def folder():
    """The worker's private folder; waits for its hello the first time."""
    until = time.monotonic() + 20.0
    while _state["hello"] is None and time.monotonic() < until:
        drain(0.1)
    if _state["hello"] is None:
        raise client.WorkerLostError("the engine does not answer")
    return _state["hello"]["folder"]


def drain(wait=0.0):
    """Take in what has come, for at most ``BUDGET_S``; background tests call this themselves."""
    worker, until, changed = _state["client"], time.monotonic() + BUDGET_S, False
    while worker is not None:
        item = worker.drain(wait)
        if item is None:
            break
        _take(*item)
        changed, wait = True, 0.0
        if time.monotonic() > until:
            break
    return changed


def _take(kind, number, content):
    if kind == "lost":
        _lost(content)
        return
    job = _state["jobs"].get(number)
    if job is None:
        return
    if kind == "note":
        if job.note:
            job.note(job, content)
        return
    del _state["jobs"][number]
    if kind == "error":
        say(job, content)
    else:
        job.done(job, content)


def say(job, error):
    """Show an error where the user looks for results."""
    if error["code"] in (-32001, -32002):  # superseded, cancelled: as asked
        return
    scene = job.scene_now()
    if scene is not None:
        scene.causticload.message = error["message"]
    _state["text"] = error["message"]


def _lost(words):
    worker, _state["client"] = _state["client"], None
    pending, _state["jobs"] = _state["jobs"], {}
    _state.update(hello=None, vocabulary=None)
    text = "The engine has ended" + (f": {words}" if words else "")
    _state["text"] = text
    for job in pending.values():
        scene = job.scene_now()
        if scene is not None and scene.name:
            scene.causticload.message = text
    if worker is not None:
        worker.stop()


def tick():
    """The timer: it must never raise, or Blender drops it."""
    try:
        if drain():
            redraw()
        from . import handlers

        handlers.pending()
    except Exception as error:
        print(f"causticload: {type(error).__name__}: {error}")
    return TICK_S if _state["client"] is not None else None


def redraw():
    """Panels are drawn anew only when asked."""
    for window in bpy.context.window_manager.windows:
        for area in window.screen.areas:
            if area.type in ("VIEW_3D", "PREFERENCES"):
                area.tag_redraw()


def stop():
    """End the worker and the timer."""
    worker, _state["client"] = _state["client"], None
    _state.update(hello=None, vocabulary=None, jobs={}, text="not started")
    if worker is not None:
        worker.stop()
    if bpy.app.timers.is_registered(tick):
        bpy.app.timers.unregister(tick)
