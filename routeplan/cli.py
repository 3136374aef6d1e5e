"""The command line: arguments, what is printed, exit codes; no formula."""

from __future__ import annotations

import argparse
import contextlib
import json
import os
import sys
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from routeplan import __version__
from routeplan.errors import InputError, Problem, RouteplanError

if TYPE_CHECKING:
    from routeplan.planning import Plan

__all__ = ["main", "make_parser"]

_EPILOG = """exit codes: 0 nothing fails; 1 planned, all sheets written, some check fails;
2 the input is wrong or no layout is possible, nothing written."""


def make_parser() -> argparse.ArgumentParser:
    """Return the parser of every command."""
    parser = argparse.ArgumentParser(
        prog="routeplan",
        description="Plan outside-plant singlemode fibre runs, from lengths and reels to light.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
    )
    parser.add_argument("--version", action="version", version=f"routeplan {__version__}")
    commands = parser.add_subparsers(dest="command", required=True, metavar="COMMAND")

    plan = commands.add_parser("plan", help="plan a run and write the sheets")
    plan.add_argument("run", metavar="RUN", help=_RUN_HELP)
    plan.add_argument("--out", metavar="DIR", help="folder for the sheets (default: beside RUN)")
    _add_json(plan)
    plan.set_defaults(act=_plan)

    check = commands.add_parser("check", help="read a run, report every problem, write nothing")
    check.add_argument("run", metavar="RUN", help=_RUN_HELP)
    _add_json(check)
    check.set_defaults(act=_check)

    new = commands.add_parser("new", help="write a commented run file for a geometry file")
    new.add_argument("geometry", metavar="GEOMETRY", help="any vector file of lines and points")
    new.add_argument(
        "--out", metavar="FILE", help="run file to write (default: run.toml beside it)"
    )
    new.set_defaults(act=_new)

    tables = commands.add_parser("tables", help="show the published numbers with their sources")
    tables.add_argument("name", metavar="NAME", nargs="?", help="one table; left out: list them")
    _add_json(tables)
    tables.set_defaults(act=_tables)
    return parser


_RUN_HELP = "a run file, a folder holding run.toml, or a bare geometry file"


def _add_json(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("--json", action="store_true", help="print the result as JSON on stdout")


def main(argv: Sequence[str] | None = None) -> int:
    """
    Run one command and return its exit code.

    Parameters
    ----------
    argv
        Arguments without the program's name; None takes those of the process.
    """
    try:
        arguments = make_parser().parse_args(argv)
    except SystemExit as stop:  # argparse has said why
        return stop.code if isinstance(stop.code, int) else 2
    act: Callable[[argparse.Namespace], int] = arguments.act
    try:
        code = act(arguments)
        sys.stdout.flush()
        return code
    except RouteplanError as error:
        return _complain(error, as_json=getattr(arguments, "json", False))
    except BrokenPipeError:
        # Whoever read our output has gone; keep the interpreter from complaining at exit.
        with contextlib.suppress(OSError, ValueError):
            os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except KeyboardInterrupt:
        return 130


def _complain(error: RouteplanError, *, as_json: bool) -> int:
    for problem in error.problems:
        print(_one_line(str(problem)), file=sys.stderr)
    if as_json:
        problems = [problem.as_dict() for problem in error.problems]
        print(json.dumps({"problems": problems}, ensure_ascii=False, indent=1))
    return 2


def _one_line(text: str) -> str:
    """Return text with what could steer a terminal made visible."""
    return "".join(c if c.isprintable() else repr(c)[1:-1] for c in text)


def _plan(arguments: argparse.Namespace) -> int:
    from routeplan.planning import plan
    from routeplan.run import read_run
    from routeplan.sheets.summary import summary_text
    from routeplan.sheets.write import SHEET_NAMES, write_sheets

    with _progress(3 + len(SHEET_NAMES)) as advance:
        advance("reading")
        run = read_run(arguments.run)
        advance("planning")
        planned = plan(run)
        folder = Path(arguments.out) if arguments.out else _default_folder(arguments.run)
        paths = write_sheets(planned, folder, on_sheet=advance)
    if arguments.json:
        text = next(path for path in paths if path.name == "plan.json").read_text("utf-8")
        print(text, end="")
    else:
        print(summary_text(planned, folder=folder, names=[path.name for path in paths]), end="")
        _warn(planned)
    return 1 if planned.verdict == "fails" else 0


def _default_folder(run: str) -> Path:
    path = Path(run)
    if path.is_dir():
        return path / "sheets"
    if path.suffix.lower() == ".toml":
        return path.parent / "sheets"
    return path.parent / f"{path.name.split('.')[0] or path.stem}_sheets"


def _warn(planned: Plan, *, most: int = 12) -> None:
    for where, message in planned.warnings[:most]:
        print(_one_line(f"warning: {where}: {message}"), file=sys.stderr)
    if len(planned.warnings) > most:
        print(f"warning: and {len(planned.warnings) - most} more, in the report", file=sys.stderr)


def _check(arguments: argparse.Namespace) -> int:
    from routeplan.planning import plan
    from routeplan.run import read_run

    planned = plan(read_run(arguments.run))
    if arguments.json:
        warnings = [{"where": w, "message": m} for w, m in planned.warnings]
        print(json.dumps({"problems": [], "warnings": warnings}, ensure_ascii=False, indent=1))
        return 0
    _warn(planned, most=len(planned.warnings))
    count = len(planned.warnings)
    print(f"{planned.run.title}: no problem, {count} warning{'' if count == 1 else 's'}")
    return 0


def _new(arguments: argparse.Namespace) -> int:
    from routeplan.run.newfile import new_run_text

    geometry = Path(arguments.geometry)
    path = Path(arguments.out) if arguments.out else geometry.parent / "run.toml"
    text = new_run_text(geometry)
    try:
        with path.open("x", encoding="utf-8", newline="\n") as file:
            file.write(text)
    except OSError as error:
        raise InputError(
            Problem(
                where=str(path),
                what="cannot be written",
                value=error.strerror or str(error),
                remedy="Choose another file with --out",
            )
        ) from None
    print(f"wrote {path}")
    return 0


def _tables(arguments: argparse.Namespace) -> int:
    from routeplan.sheets.published import published_json, published_text

    if arguments.json:
        print(json.dumps(published_json(arguments.name), ensure_ascii=False, indent=1))
    else:
        print(published_text(arguments.name), end="")
    return 0


@contextlib.contextmanager
def _progress(total: int) -> Iterator[Callable[[str], None]]:
    """Yield a function that names the next step; a bar shows after a second, on a terminal only."""
    if not sys.stderr.isatty():
        yield lambda _: None
        return
    from tqdm import tqdm

    with tqdm(total=total, delay=1.0, leave=False, bar_format="{desc:24}|{bar}|") as bar:

        def advance(name: str) -> None:
            bar.set_description_str(name)
            bar.update(1)

        yield advance
