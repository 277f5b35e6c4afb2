"""The command line: a person's door to the engine."""

from __future__ import annotations

import argparse
import json
import signal
import sys
import threading
import traceback
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any, ClassVar

from causticload.errors import CausticloadError, InputError
from causticload.version import __version__

DONE, FAULT, WRONG_INPUT, EXCEEDED, INTERRUPTED = 0, 1, 2, 3, 130

EPILOGS = {
    "inspect": "example:\n  causticload inspect sample_meshes/tower.toml",
    "instant": "examples:\n"
    "  causticload instant tower.toml --at 2026-06-21T13:30\n"
    "  causticload instant tower.toml --sun 195,48 --beam 850 --out hot",
    "year": "examples:\n"
    "  causticload year tower.toml --out tower-year\n"
    "  causticload year tower.toml --out tower-year --resume",
    "memo": "examples:\n"
    "  causticload memo tower-year\n"
    "  causticload memo tower-year --format docx,pdf",
    "compare": "example:\n  causticload compare tower-year tower-flat-year --out difference",
    "install-addon": "example:\n  causticload install-addon blender",
    "worker": "The protocol is described in DEVELOPERS.md, with a client.",
    "finishes": "example:\n  causticload finishes --plot finishes.png",
}


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="causticload",
        description="Find where, when and how strongly a curved glazed or polished facade "
        "concentrates sunlight. A screening aid: local codes and licensed practice decide.",
    )
    parser.add_argument("--version", action="version", version=f"causticload {__version__}")
    commands = parser.add_subparsers(dest="command", required=True, metavar="COMMAND")

    def add(name: str, text: str, *, study: bool = True) -> argparse.ArgumentParser:
        sub = commands.add_parser(
            name,
            help=text,
            description=text,
            epilog=EPILOGS.get(name),
            formatter_class=argparse.RawDescriptionHelpFormatter,
        )
        if study:
            sub.add_argument("study", metavar="STUDY", type=Path, help="study file (TOML)")
        sub.add_argument("--json", action="store_true", help="print JSON and nothing else")
        sub.add_argument("--quiet", action="store_true", help="print no progress and no summary")
        sub.add_argument("--debug", action="store_true", help="print a traceback on a fault")
        return sub

    inspect = add("inspect", "Read the model and say what it is: roles, panels, focus, faults.")
    inspect.add_argument("--at", metavar="TIME", help="also tell where the facade focuses then")
    inspect.add_argument("--sun", metavar="AZIMUTH,ELEVATION", help="degrees, instead of a time")
    inspect.add_argument("--out", type=Path, metavar="DIR", help="write facade.vtp for that sun")

    instant = add("instant", "Find the loads for one position of the sun.")
    instant.add_argument("--at", metavar="TIME", help="local clock time, like 2026-06-21T13:30")
    instant.add_argument("--sun", metavar="AZIMUTH,ELEVATION", help="degrees, instead of a time")
    instant.add_argument("--beam", type=float, metavar="W/m²", help="beam that goes with --sun")
    instant.add_argument("--out", type=Path, metavar="DIR", help="write meshes and a picture")

    year = add("year", "Screen a whole year and write a result folder.")
    year.add_argument("--out", type=Path, metavar="DIR", help="result folder (STUDY.causticload)")
    year.add_argument("--workers", type=int, metavar="N", help="days worked off at once")
    year.add_argument("--cluster", metavar="ADDRESS", help="scheduler of a Dask cluster")
    year.add_argument("--resume", action="store_true", help="go on from the days already done")
    year.add_argument(
        "--fail-over", action="store_true", help="leave with 3 if a criterion is exceeded"
    )

    memo = add("memo", "Write the memo of a year from its result folder.", study=False)
    memo.add_argument("folder", metavar="DIR", type=Path, help="result folder of a year")
    memo.add_argument(
        "--format", metavar="LIST", default="docx,pdf,html", help="of docx, pdf, html (all)"
    )
    compare = add("compare", "Tell what a change of design did to a year.", study=False)
    compare.add_argument("before", metavar="DIR_A", type=Path, help="result folder before")
    compare.add_argument("after", metavar="DIR_B", type=Path, help="result folder after")
    compare.add_argument("--out", type=Path, metavar="DIR", help="write meshes and a memo")

    finishes = add("finishes", "List the built-in finishes with their sources.", study=False)
    finishes.add_argument("--plot", type=Path, metavar="PNG", help="draw reflectance over angle")
    addon = add("install-addon", "Install the add-on into a modelling program.", study=False)
    addon.add_argument("host", choices=["blender"], help="the program")
    addon.add_argument("--into", type=Path, metavar="DIR", help="its user scripts folder")

    add("worker", "Answer JSON-RPC 2.0 on standard input and output.", study=False)
    return parser


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line.

    Parameters
    ----------
    arguments : sequence of str, optional
        Arguments after the program's name; the process's own if they are not given.

    Returns
    -------
    code : int
        0 done; 1 fault of the program; 2 wrong input; 3 a criterion is exceeded, with
        ``--fail-over``; 130 interrupted.
    """
    options = _parser().parse_args(arguments)
    try:
        return _COMMANDS[options.command](options)
    except CausticloadError as error:
        _say_error(options, str(error), where=error.where, hint=error.hint)
        return WRONG_INPUT
    except KeyboardInterrupt:
        print("Interrupted.", file=sys.stderr)
        return INTERRUPTED
    except BrokenPipeError:  # the reader of a pipe has left: nothing is wrong here
        return DONE
    except Exception as fault:
        if options.debug:
            traceback.print_exc()
        else:
            _say_error(
                options,
                f"Fault of the program: {type(fault).__name__}: {fault}. "
                "Run again with --debug for a report to send in.",
            )
        return FAULT


def _say_error(options: argparse.Namespace, text: str, *, where: str = "", hint: str = "") -> None:
    if options.json:
        print(json.dumps({"error": {"message": text, "where": where, "hint": hint}}))
    else:
        print(text, file=sys.stderr)


def _print(options: argparse.Namespace, data: Any, text: Callable[[], str]) -> None:
    """Print a result as JSON or as text, whichever was asked for."""
    if options.json:
        print(json.dumps(data, indent=2, ensure_ascii=False, default=str))
    elif not options.quiet:
        print(text())


def _inspect(options: argparse.Namespace) -> int:
    from causticload.output.text import summarise_inspect
    from causticload.run import inspect, open_project, save_focus
    from causticload.study import read_study

    sun = _two_numbers(options.sun, "--sun") if options.sun else None
    if options.out and sun is None and options.at is None:
        raise InputError("focal distances want a sun", where="--out", hint="Add --sun or --at.")
    project = open_project(read_study(options.study))
    report = inspect(project, at=options.at, sun=sun)
    if options.out:
        options.out.mkdir(parents=True, exist_ok=True)
        save_focus(project, options.out / "facade.vtp", at=options.at, sun=sun)
    _print(options, report, lambda: summarise_inspect(report))
    return DONE


def _two_numbers(text: str, name: str) -> tuple[float, float]:
    try:
        a, b = (float(part) for part in text.split(","))
    except ValueError:
        raise InputError(
            f"two numbers with a comma between them are wanted, got {text!r}",
            where=name,
            hint="For example --sun 195,48.",
        ) from None
    return a, b


def _instant(options: argparse.Namespace) -> int:
    from causticload.output.instant import instant_record, save_instant
    from causticload.output.text import summarise_instant
    from causticload.run import solve_instant
    from causticload.study import read_study

    sun = _two_numbers(options.sun, "--sun") if options.sun else None
    instant = solve_instant(read_study(options.study), at=options.at, sun=sun, beam=options.beam)
    if options.out:
        save_instant(instant, options.out)
    _print(options, instant_record(instant), lambda: summarise_instant(instant))
    return DONE


def _year(options: argparse.Namespace) -> int:
    from causticload.output.folder import DayStore, save_year, working_in
    from causticload.output.text import summarise_year
    from causticload.run import Stopped, solve_year
    from causticload.study import read_study

    if options.workers is not None and options.workers < 1:
        raise InputError(f"must be at least 1, got {options.workers}", where="--workers")
    study = read_study(options.study)
    out = options.out or options.study.with_suffix(".causticload")
    stop = threading.Event()
    with working_in(out), _Bar(options) as bar, _stopping(stop):
        store = DayStore(out, study, resume=options.resume)
        try:
            year = solve_year(
                study,
                progress=bar.update,
                threads=options.workers,
                store=store,
                stop=stop,
                client=_cluster(options.cluster),
            )
        except Stopped:
            bar.close()
            print(
                f"Stopped. Finished days are kept in {out}; go on with --resume.", file=sys.stderr
            )
            return INTERRUPTED
        bar.update("writing", 0, 1)
        save_year(year, out)
        bar.update("writing", 1, 1)
    _print(options, year.summary, lambda: summarise_year(year) + f"\n\nResults: {out}")
    return EXCEEDED if options.fail_over and year.episodes else DONE


def _cluster(address: str | None) -> Any:
    if address is None:
        return None
    try:
        from distributed import Client
    except ImportError:
        raise InputError(
            "the cluster extra is not installed",
            where="--cluster",
            hint="Install it with: pip install 'causticload[cluster]'.",
        ) from None
    try:
        return Client(address, timeout="10s")
    except (OSError, ValueError) as error:
        raise InputError(f"no scheduler answers at {address}: {error}", where="--cluster") from None


class _stopping:  # noqa: N801 - reads as what it does in a with statement
    """While a year runs, Ctrl-C and a polite kill ask it to stop instead of breaking it off."""

    def __init__(self, stop: threading.Event) -> None:
        self.stop = stop

    def __enter__(self) -> None:
        self.old = {
            s: signal.signal(s, lambda *_: self.stop.set()) for s in (signal.SIGINT, signal.SIGTERM)
        }

    def __exit__(self, *_: object) -> None:
        for number, handler in self.old.items():
            signal.signal(number, handler)


class _Bar:
    """A progress bar with the time left, on a terminal only."""

    NAMES: ClassVar = {
        "days": "Days of the year",
        "peaks": "Peaks and ray counts",
        "effects": "Effects and cures",
        "writing": "Writing",
    }

    def __init__(self, options: argparse.Namespace) -> None:
        self.shown = sys.stderr.isatty() and not (options.quiet or options.json)
        self.tasks: dict[str, Any] = {}

    def __enter__(self) -> _Bar:
        from rich.console import Console
        from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

        self.bar = Progress(
            TextColumn("{task.description:<22}"),
            BarColumn(),
            TextColumn("{task.completed}/{task.total}"),
            TimeRemainingColumn(compact=True),
            console=Console(stderr=True),
            disable=not self.shown,
        )
        self.bar.start()
        return self

    def update(self, stage: str, done: int, total: int) -> None:
        """Show how far a stage is."""
        if stage not in self.tasks:
            self.tasks[stage] = self.bar.add_task(self.NAMES.get(stage, stage), total=total)
        self.bar.update(self.tasks[stage], completed=done, total=total)

    def close(self) -> None:
        """Take the bar off the screen."""
        self.bar.stop()

    def __exit__(self, *_: object) -> None:
        self.close()


def _memo(options: argparse.Namespace) -> int:
    from causticload.output.memo import write_memo

    paths = write_memo(options.folder, formats=options.format.split(","))
    _print(
        options,
        {"files": [str(p) for p in paths]},
        lambda: "Written:\n" + "\n".join(f"  {p}" for p in paths),
    )
    return DONE


def _compare(options: argparse.Namespace) -> int:
    from causticload.output.compare import compare_years, comparison_record, save_comparison
    from causticload.output.text import summarise_comparison

    comparison = compare_years(options.before, options.after)
    if options.out:
        save_comparison(comparison, options.out)
    _print(options, comparison_record(comparison), lambda: summarise_comparison(comparison))
    return DONE


def _finishes(options: argparse.Namespace) -> int:
    from causticload.optics import list_finishes
    from causticload.output.text import summarise_finishes

    rows = list_finishes()
    if options.plot:
        from causticload.output.pictures import plot_finishes

        plot_finishes(options.plot)
    _print(options, rows, lambda: summarise_finishes(rows))
    return DONE


def _install_addon(options: argparse.Namespace) -> int:
    from causticload.output.install import install_addon

    places = install_addon(options.host, into=options.into)
    _print(
        options,
        {"installed": [str(p) for p in places]},
        lambda: "Installed:\n" + "\n".join(f"  {p}" for p in places),
    )
    return DONE


def _worker(options: argparse.Namespace) -> int:
    from causticload.worker import serve

    serve()
    return DONE


_COMMANDS: dict[str, Callable[[argparse.Namespace], int]] = {
    "inspect": _inspect,
    "instant": _instant,
    "year": _year,
    "memo": _memo,
    "compare": _compare,
    "finishes": _finishes,
    "install-addon": _install_addon,
    "worker": _worker,
}


if __name__ == "__main__":
    sys.exit(main())
