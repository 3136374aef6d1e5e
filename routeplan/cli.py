"""The command line: arguments, what is printed, exit codes; no formula."""

from __future__ import annotations

import argparse
import atexit
import contextlib
import gc
import os
import re
import sys
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, NoReturn

from routeplan import __version__
from routeplan.errors import InputError, Problem, RouteplanError
from routeplan.quick_options import OPTIONS
from routeplan.route_options import ROUTE_OPTIONS
from routeplan.terminal import progress, say, say_json, say_json_text, visible

if TYPE_CHECKING:
    from routeplan.planning import Plan

__all__ = ["main", "make_parser"]

_EPILOG = """exit codes: 0 nothing fails; 1 planned, all sheets written, some check fails;
2 the input is wrong or no layout is possible, nothing written."""

_RUN_HELP = "a run file, a folder holding run.toml, or a bare geometry file"

_SHOWN_WARNINGS = 12


class _Parser(argparse.ArgumentParser):
    """A parser whose complaints are problems like all others."""

    def error(self, message: str) -> NoReturn:
        remedy = f"See {self.prog} --help"
        raise InputError(Problem(where="command line", what=message, remedy=remedy))


def make_parser() -> argparse.ArgumentParser:
    """Return the parser of every command."""
    parser = _Parser(
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

    budget = commands.add_parser("budget", help="work out a loss budget with no map")
    for option in OPTIONS:
        is_list = "append" if option.is_repeated else "store"
        help_text = option.text.replace("%", "%%")
        budget.add_argument(option.label, metavar=option.metavar, action=is_list, help=help_text)
    _add_json(budget)
    budget.set_defaults(act=_budget)

    route = commands.add_parser("route", help="find ways along streets and write them to plan")
    place_help = "LON,LAT or NAME=LON,LAT in degrees, or a site of --run"
    route.add_argument("start", metavar="FROM", help=place_help)
    route.add_argument("end", metavar="TO", help=place_help)
    _add_route_options(route)
    _add_json(route)
    route.set_defaults(act=_route)

    tables = commands.add_parser("tables", help="show the published numbers with their sources")
    tables.add_argument("name", metavar="NAME", nargs="?", help="one table; left out: list them")
    _add_json(tables)
    tables.set_defaults(act=_tables)
    return parser


def _add_route_options(parser: argparse.ArgumentParser) -> None:
    for option in ROUTE_OPTIONS:
        if option.metavar:
            action = "append" if option.is_repeated else "store"
            parser.add_argument(
                option.label, metavar=option.metavar, action=action, help=option.text
            )
        else:
            parser.add_argument(option.label, action="store_true", help=option.text)


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
    given = sys.argv[1:] if argv is None else list(argv)
    try:
        arguments = make_parser().parse_args([_told_from_options(each) for each in given])
        act: Callable[[argparse.Namespace], int] = arguments.act
        return act(arguments)
    except SystemExit:  # help or version has been printed
        return 0
    except RouteplanError as error:
        return _complain(error, as_json="--json" in given)
    except KeyboardInterrupt:
        return 130


def _told_from_options(argument: str) -> str:
    """Return an argument with a blank before it where it is a place west of Greenwich."""
    return f" {argument}" if re.match(r"-[\d.]+,", argument) else argument


def _complain(error: RouteplanError, *, as_json: bool) -> int:
    for problem in error.problems:
        say(visible(str(problem)), stream=sys.stderr)
    if as_json:
        with contextlib.suppress(InputError):  # nobody can be told where stdout is gone
            say_json({"problems": [problem.as_dict() for problem in error.problems]})
    return 2


@contextlib.contextmanager
def _resting_collector() -> Iterator[None]:
    """
    Let the garbage collector rest: what a plan and its imports make is all still needed.

    What was made meanwhile joins the collector's oldest generation unsearched, or the first
    object made afterwards would have all of it searched; and nothing is searched once more as the
    process ends, when its memory goes back anyhow.
    """
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        gc.freeze()
        gc.unfreeze()
        atexit.unregister(gc.freeze)  # once, however often a process plans
        atexit.register(gc.freeze)
        if was_enabled:
            gc.enable()


@_resting_collector()
def _plan(arguments: argparse.Namespace) -> int:
    from routeplan.planning import plan
    from routeplan.run import read_run
    from routeplan.sheets.summary import summary_text
    from routeplan.sheets.write import SHEET_NAMES, write_sheets

    with progress(2 + len(SHEET_NAMES)) as advance:
        advance("reading")
        run = read_run(arguments.run)
        advance("planning")
        planned = plan(run)
        folder = Path(arguments.out) if arguments.out else _default_folder(arguments.run)
        paths = write_sheets(planned, folder, on_sheet=advance)
    if arguments.json:
        document = next(path for path in paths if path.name == "plan.json")
        say_json_text(document.read_text("utf-8").rstrip("\n"))
    else:
        say(summary_text(planned, folder=folder, names=[path.name for path in paths]))
    _warn(planned, most=_SHOWN_WARNINGS)
    return 1 if planned.verdict == "fails" else 0


def _default_folder(run: str) -> Path:
    path = Path(run)
    if path.is_dir():
        return path / "sheets"
    if path.suffix.lower() == ".toml":
        return path.parent / "sheets"
    # A layer named behind a bar is not part of the file's own name.
    file = path if path.exists() else Path(run.rpartition("|")[0] or run)
    return file.parent / f"{file.stem}_sheets"


def _warn(planned: Plan, *, most: int) -> None:
    for where, message in planned.warnings[:most]:
        say(visible(f"warning: {where}: {message}"), stream=sys.stderr)
    if len(planned.warnings) > most:
        more = len(planned.warnings) - most
        say(f"warning: and {more} more, in report.html", stream=sys.stderr)


@_resting_collector()
def _check(arguments: argparse.Namespace) -> int:
    from routeplan.planning import plan
    from routeplan.run import read_run

    planned = plan(read_run(arguments.run))
    count = len(planned.warnings)
    if arguments.json:
        warnings = [{"where": where, "message": text} for where, text in planned.warnings]
        say_json({"problems": [], "warnings": warnings})
    else:
        noun = "warning" if count == 1 else "warnings"
        say(f"{visible(planned.run.title)}: no problem, {count} {noun}")
    _warn(planned, most=count)
    return 0


def _new(arguments: argparse.Namespace) -> int:
    from routeplan.run.newfile import new_run_text

    geometry = Path(arguments.geometry)
    path = Path(arguments.out) if arguments.out else geometry.parent / "run.toml"
    text = new_run_text(geometry, named=_seen_from(path.parent, geometry))
    try:
        with path.open("xb") as file:
            file.write(text.encode("utf-8", "replace"))
    except OSError as error:
        raise InputError(
            Problem(
                where=str(path),
                what="cannot be written",
                value=error.strerror or str(error),
                remedy="Choose another file with --out",
            )
        ) from None
    say(visible(f"wrote {path}"))
    return 0


def _seen_from(folder: Path, file: Path) -> str:
    """Return the name of a file as a run file in `folder` has it."""
    try:
        parents = os.path.realpath(file.parent), os.path.realpath(folder)
        return Path(os.path.relpath(*parents), file.name).as_posix()
    except ValueError:  # on another drive
        return file.absolute().as_posix()


def _budget(arguments: argparse.Namespace) -> int:
    from routeplan.quick import quick_answer
    from routeplan.quick_options import order_from_options
    from routeplan.sheets.quick_budget import quick_json, quick_text

    given = {option.name: getattr(arguments, option.name) for option in OPTIONS}
    answer = quick_answer(order_from_options(given))
    if arguments.json:
        say_json(quick_json(answer))
    else:
        say(quick_text(answer))
    return 1 if answer.verdict == "fails" else 0


def _route(arguments: argparse.Namespace) -> int:
    from routeplan.route_options import order_of
    from routeplan.routing import find_ways, routed_text

    order = order_of(vars(arguments))
    with progress(4) as advance:
        routed = find_ways(order, on_step=advance)
    if arguments.json:
        say_json(routed.document)
    else:
        say("\n".join(visible(line) for line in routed_text(routed).splitlines()))
    for where, message in routed.warnings[:_SHOWN_WARNINGS]:
        say(visible(f"warning: {where}: {message}"), stream=sys.stderr)
    return 0


def _tables(arguments: argparse.Namespace) -> int:
    from routeplan.sheets.published import published_json, published_text

    if arguments.json:
        say_json(published_json(arguments.name))
    else:
        say(published_text(arguments.name).rstrip("\n"))
    return 0
