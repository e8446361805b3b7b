import unicodedata

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from swaygauge.visible import visible


@pytest.mark.parametrize(
    ("name", "shown"),
    [
        ("a\tb\nc\x00", r"a\x09b\x0ac\x00"),
        ("\x1b[31mred", r"\x1b[31mred"),
        ("safe\u202egnp.exe", r"safe\u202egnp.exe"),
        ("a\u200bb", r"a\u200bb"),
        ("a\u2066b\u2069", r"a\u2066b\u2069"),
        ("shy\u00adhyphen", r"shy\xadhyphen"),
        ("no\u00a0break", r"no\xa0break"),
        ("\udc80bad byte", r"\udc80bad byte"),
        ("private\ue000", r"private\ue000"),
        ("unassigned\u0378", r"unassigned\u0378"),
        ("tag\U000e0041", r"tag\U000e0041"),
        ("filler\u3164", r"filler\u3164"),
        ("\u0301mark first", r"\u0301mark first"),
        ("line\u2028break", r"line\u2028break"),
        ("harbour\u200cnews", r"harbour\u200cnews"),  # a joiner where no spelling needs one
        ("harbour\ufe0f", r"harbour\ufe0f"),
    ],
)
def test_what_would_be_invisible_is_shown(name: str, shown: str) -> None:
    assert visible(name) == shown


@pytest.mark.parametrize(
    "name",
    [
        "harbournews.example",
        "Größe & Maß <b>",
        "東京　ひらがな カタカナ",  # with an ideographic space
        "葛\U000e0100飾区",  # a Han letter with a variation selector
        "می\u200cخواهم",  # Persian needs the zero-width non-joiner (RFC 5892 A.1)
        "क्\u200dष",  # Devanagari, joiner after a virama (RFC 5892 A.2)
        "สวัสดี",
        "ሰላም",
        "é",
        "한국어",
        "❤\ufe0f",
        "👩\u200d🚀",
        "👍🏽",
        "𓀀𓁐",
        "עברית",
    ],
)
def test_ordinary_text_of_any_script_is_left_alone(name: str) -> None:
    assert visible(name) == name


def test_a_long_name_is_shortened_in_the_middle_and_says_how_long_it_is() -> None:
    name = "start" + "x" * 10_000 + "end"
    shown = visible(name)
    assert shown.startswith("startxxx")
    assert shown.endswith("xxxend")
    assert "[... 10008 characters ...]" in shown
    assert len(shown) < 160
    assert visible(name, limit=None) == name


@given(st.text(max_size=300), st.one_of(st.none(), st.integers(0, 200)))
@settings(deadline=None)
def test_nothing_that_controls_a_terminal_or_the_reading_direction_gets_through(name: str, limit: int | None) -> None:
    shown = visible(name, limit=limit)
    kept = {char for char in shown if unicodedata.category(char) in ("Cc", "Cs", "Co", "Cn", "Zl", "Zp")}
    assert not kept
    assert not any(unicodedata.bidirectional(char) in BIDI_CONTROLS for char in shown)
    assert not set(shown) & set("\u200e\u200f\u061c\ufeff\u200b\u2060")
    shown.encode("utf-8")  # no lone surrogate is left


BIDI_CONTROLS = {"LRE", "RLE", "LRO", "RLO", "PDF", "LRI", "RLI", "FSI", "PDI"}
