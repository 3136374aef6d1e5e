"""Text from files is harmless on our pages, and numbers read as people write them."""

from __future__ import annotations

import json
from html.parser import HTMLParser

import pytest
from hypothesis import given
from hypothesis import strategies as st

from routeplan.sheets.text import (
    count_text,
    data_block,
    length_text,
    number_text,
    plain,
    safe,
)
from tests.sheets.made_up_run import HOSTILE_NAMES

NARROW = "\N{NARROW NO-BREAK SPACE}"


class _Parsed(HTMLParser):
    """What a browser would see: the tags and the text."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.attributes: list[tuple[str, str | None]] = []
        self.text = ""
        self.feed(html)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append(tag)
        self.attributes.extend(attrs)

    def handle_data(self, data: str) -> None:
        self.text += data


@pytest.mark.parametrize("name", [*HOSTILE_NAMES, "{{ 7 * 7 }}", "{% raw %}", '" onclick="x'])
def test_hostile_names_stay_text_in_elements_and_attributes(name: str) -> None:
    """A name read back from an element or an attribute is the name, and adds no tag."""
    parsed = _Parsed(f'<b title="{safe(name)}">{safe(name)}</b>')
    assert parsed.tags == ["b"]
    assert parsed.attributes == [("title", name)]
    assert parsed.text == name


@given(st.text())
def test_any_text_survives_as_its_plain_form(text: str) -> None:
    """Whatever a file holds, a page shows its plain form and nothing else."""
    parsed = _Parsed(f"<i>{safe(text)}</i>")
    assert parsed.tags == ["i"]
    assert parsed.text == plain(text)


@given(st.text())
def test_safe_text_holds_no_mark_that_a_script_or_template_reads(text: str) -> None:
    """None of the marks with a meaning to HTML, JavaScript or templates is left."""
    assert not set("<>\"'`$\\{}").intersection(safe(text))


def test_what_cannot_be_seen_is_made_visible() -> None:
    """A direction override would turn a name round on the page; it becomes a visible mark."""
    assert (
        plain("Hill\u202egnol\x00") == "Hill\N{REPLACEMENT CHARACTER}gnol\N{REPLACEMENT CHARACTER}"
    )
    assert plain(" two\n lines ") == "two lines"


@given(st.recursive(st.none() | st.integers() | st.text(), lambda s: st.lists(s, max_size=4)))
def test_data_cannot_leave_its_script_element(data: object) -> None:
    """The data block is one element whatever it holds, and reads back as it was but for unseen."""
    block = data_block("d", data)
    inside = block.partition(">")[2].removesuffix("</script>")
    assert not set("<>&\u2028\u2029").intersection(inside)
    json.loads(inside)


def test_data_reads_back_exactly() -> None:
    """Names with markup come out of the block unchanged."""
    block = data_block("d", list(HOSTILE_NAMES))
    assert json.loads(block.partition(">")[2].removesuffix("</script>")) == list(HOSTILE_NAMES)


def test_numbers_that_are_not_finite_never_reach_a_page() -> None:
    """A script could not read NaN, so writing it is an error rather than a broken map."""
    with pytest.raises(ValueError, match="JSON"):
        data_block("d", [float("nan")])


@pytest.mark.parametrize(
    ("value", "digits", "text"),
    [
        (None, 1, "\N{EN DASH}"),
        (0.0, 3, "0.000"),
        (-0.0004, 3, "0.000"),
        (-12.5, 1, "\N{MINUS SIGN}12.5"),
        (1234567.891, 2, f"1{NARROW}234{NARROW}567.89"),
        (999.96, 1, f"1{NARROW}000.0"),
    ],
)
def test_numbers_are_grouped_and_signed(value: float | None, digits: int, text: str) -> None:
    """Groups of three, a true minus sign, none before a zero, a dash for the unknown."""
    assert number_text(value, digits=digits) == text


def test_lengths_show_feet_beside_metres_for_us_units() -> None:
    """100 m are 328.08 ft: the international foot is 0.3048 m."""
    assert length_text(100.0) == "100.0\xa0m"
    assert length_text(100.0, units="us") == "100.0\xa0m (328\xa0ft)"
    assert length_text(None, units="us") == "\N{EN DASH}"


def test_counts_agree_with_their_nouns() -> None:
    """One joint, three joints, no joints."""
    assert [count_text(n, "joint") for n in (0, 1, 3)] == [
        "0\xa0joints",
        "1\xa0joint",
        "3\xa0joints",
    ]
