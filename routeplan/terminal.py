"""What goes to the terminal: safe lines, JSON, a progress bar."""

from __future__ import annotations

import contextlib
import json
import os
import re
import sys
from collections.abc import Callable, Iterator
from typing import TextIO

from routeplan.errors import InputError, Problem

__all__ = ["progress", "say", "say_json", "say_json_text", "visible"]

_UNUSUAL = re.compile(r"[^\n -~]")


def visible(text: str) -> str:
    r"""
    Return text on one line, with what could steer a terminal or cannot be seen spelt out.

    Examples
    --------
    >>> print(visible("Hill\x1b[2J\ntop"))
    Hill\x1b[2J\ntop
    """
    if text.isprintable():
        return text
    return "".join(mark if mark.isprintable() else repr(mark)[1:-1] for mark in text)


def say(text: str, *, stream: TextIO | None = None) -> None:
    """
    Print lines to stdout, or to another stream, at once.

    A reader that has gone is no error: what was asked for is done, and nothing more is printed.
    Characters that the stream cannot carry are spelt out.

    Parameters
    ----------
    text
        What to print, without the last newline.
    stream
        Where to, by default stdout.

    Raises
    ------
    InputError
        If stdout cannot be written to, for example on a full disk.
    """
    out = sys.stdout if stream is None else stream
    coding = getattr(out, "encoding", None) or "utf-8"
    try:
        out.write(text.encode(coding, "backslashreplace").decode(coding) + "\n")
        out.flush()
    except OSError as error:
        _plug(out)
        if stream is None and not isinstance(error, BrokenPipeError):
            reason = error.strerror or str(error)
            problem = Problem(where="standard output", what="cannot be written to", value=reason)
            raise InputError(problem) from None


def _plug(out: TextIO) -> None:
    """Send the rest to nowhere, so that the interpreter does not complain at its end."""
    with contextlib.suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, out.fileno())
        os.close(nowhere)


def say_json(value: object) -> None:
    """Print a value as JSON."""
    say_json_text(json.dumps(value, ensure_ascii=False, indent=1))


def say_json_text(text: str) -> None:
    """Print JSON; what a terminal could take for a command, or not show, is escaped."""
    coding = getattr(sys.stdout, "encoding", None) or "utf-8"

    def shown(found: re.Match[str]) -> str:
        mark = found[0]
        with contextlib.suppress(UnicodeEncodeError):
            if mark.isprintable() and mark.encode(coding):
                return mark
        return json.dumps(mark)[1:-1]

    say(_UNUSUAL.sub(shown, text))


@contextlib.contextmanager
def progress(total: int) -> Iterator[Callable[[str], None]]:
    """
    Yield a function that names the next step; a bar shows after a second, on a terminal only.

    Parameters
    ----------
    total
        How many steps there are.
    """
    if not sys.stderr.isatty():
        yield lambda _: None
        return
    from tqdm import tqdm

    with tqdm(total=total, delay=1.0, leave=False, bar_format="{desc:24}|{bar}|") as bar:

        def advance(name: str) -> None:
            bar.set_description_str(name, refresh=False)
            bar.update(1)

        yield advance
