"""What is printed is safe to look at, and a bar shows on a terminal only."""

from __future__ import annotations

import io
import json
import sys

import pytest

from routeplan.errors import InputError
from routeplan.terminal import progress, say, say_json, visible


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("plain Ünïcode €", "plain Ünïcode €"),
        ("\x1b[31mred", "\\x1b[31mred"),
        ("\x9b2J", "\\x9b2J"),
        ("a\r\n\tb", "a\\r\\n\\tb"),
        ("\u202eevil", "\\u202eevil"),
        ("\ud800", "\\ud800"),
        ("", ""),
    ],
)
def test_what_steers_is_spelt_out(text: str, shown: str) -> None:
    """Controls of both sets, marks that turn text about and half characters are spelt out."""
    assert visible(text) == shown


def test_json_is_escaped_and_equal(capsys: pytest.CaptureFixture[str]) -> None:
    """JSON on the terminal has no control character, and reads back as the same value."""
    value = {"é": ["\x7f\x9b\u202e", 1.5, None], "\U0001f4e1": "\x00"}
    say_json(value)
    out = capsys.readouterr().out
    assert json.loads(out) == value
    assert all(mark == "\n" or mark.isprintable() for mark in out)
    assert "é" in out


class _Failing(io.StringIO):
    def __init__(self, error: OSError) -> None:
        super().__init__()
        self.error = error

    def flush(self) -> None:
        raise self.error


def test_a_gone_reader_is_no_error(monkeypatch: pytest.MonkeyPatch) -> None:
    """A broken pipe is passed over, on either stream."""
    monkeypatch.setattr(sys, "stdout", _Failing(BrokenPipeError()))
    say("x")
    say("x", stream=_Failing(BrokenPipeError()))


def test_a_failing_stdout_is_a_problem(monkeypatch: pytest.MonkeyPatch) -> None:
    """Any other failure of stdout is a problem; of stderr there is nobody to tell."""
    monkeypatch.setattr(sys, "stdout", _Failing(OSError(28, "No space left on device")))
    with pytest.raises(InputError, match="No space left"):
        say("x")
    say("x", stream=_Failing(OSError(28, "No space left on device")))


class _Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_no_bar_where_nobody_looks(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Without a terminal nothing is drawn."""
    with progress(2) as advance:
        advance("reading")
    assert capsys.readouterr().err == ""


def test_the_bar_is_gone_at_the_end(monkeypatch: pytest.MonkeyPatch) -> None:
    """On a terminal work of less than a second draws nothing that stays."""
    terminal = _Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    with progress(2) as advance:
        advance("reading")
        advance("planning")
    assert terminal.getvalue().replace("\r", "").strip() == ""
