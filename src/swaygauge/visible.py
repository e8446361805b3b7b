"""Node names are untrusted: one function makes what is in them visible, for terminal, page, log and export alike.

What would be invisible or would rearrange the text around it (controls, bidirectional marks, other format characters,
lone surrogates, private and unassigned code points, odd spaces, fillers) is shown as an escape such as ``\\u202e``.
Ordinary text of any script stays as it is. That includes the invisible characters which spelling needs, where it needs
them: joiners as in RFC 5892, appendix A.1 and A.2 (Persian, Hindi) and in emoji, variation selectors after what they
vary. HTML still has to be escaped as HTML, a CSV cell as a CSV cell; that is the business of the place that writes it.
"""

from __future__ import annotations

import unicodedata
from typing import Final

ORDINARY_SPACES: Final = frozenset(" \u1680\u3000")  # space, Ogham (drawn as a line), ideographic (a full cell)
# Format characters that have a shape of their own (Unicode: Prepended_Concatenation_Mark).
SHAPED_FORMATS: Final = frozenset(
    "\u0600\u0601\u0602\u0603\u0604\u0605\u06dd\u070f\u0890\u0891\u08e2\U000110bd\U000110cd"
)
# Letters, marks and symbols without ink (Unicode: Default_Ignorable_Code_Point outside Cf; the blank braille cell).
BLANKS: Final = frozenset("\u034f\u115f\u1160\u17b4\u17b5\u2800\u3164\uffa0")
ZERO_WIDTH_NON_JOINER: Final = "\u200c"
ZERO_WIDTH_JOINER: Final = "\u200d"


def visible(name: str, *, limit: int | None = 120) -> str:
    r"""The name with everything invisible in it shown, shortened in the middle when it is very long.

    limit: the most characters of the name that are shown before it is shortened, at least 24; the full length is then
    stated inside. None never shortens. The result never holds a line break or an escape code.

    >>> visible("harbournews.example")
    'harbournews.example'
    >>> visible("safe\u202egnp.exe")
    'safe\\u202egnp.exe'
    >>> visible("x" * 10_000, limit=24)
    'xxxxxxxxxxxxxxxx[... 10000 characters ...]xxxxxxxx'
    """
    if limit is None or len(name) <= max(limit, 24):
        return _shown(name)
    tail = max(limit, 24) // 3
    head = max(limit, 24) - tail
    return f"{_shown(name[:head])}[... {len(name)} characters ...]{_shown(name[-tail:])}"


def _shown(text: str) -> str:
    if text.isascii() and text.isprintable():
        return text
    return "".join(char if _is_ordinary(text, at) else _escape(char) for at, char in enumerate(text))


def _escape(char: str) -> str:
    code = ord(char)
    return f"\\x{code:02x}" if code < 0x100 else f"\\u{code:04x}" if code < 0x10000 else f"\\U{code:08x}"


def _is_ordinary(text: str, at: int) -> bool:
    """Whether the character at this place is seen for what it is."""
    char = text[at]
    if char in ORDINARY_SPACES or char in SHAPED_FORMATS:
        return True
    if char in BLANKS:
        return False
    if char in (ZERO_WIDTH_NON_JOINER, ZERO_WIDTH_JOINER):
        return _is_spelling_joiner(text, at)
    if _is_variation_selector(char):
        return at > 0 and _takes_variation(text[at - 1], char)
    category = unicodedata.category(char)
    if category in ("Mn", "Me"):  # a mark in front of everything would sit on what stands before the name
        return at > 0
    return category[0] not in "CZ"


def _is_spelling_joiner(text: str, at: int) -> bool:
    """RFC 5892 A.1 and A.2: after a virama, between letters that join (class AL), or inside an emoji sequence."""
    if at == 0 or at + 1 == len(text):
        return False
    if unicodedata.combining(text[at - 1]) == 9:
        return True
    after = text[at + 1]
    base = at - 1
    while base > 0 and unicodedata.category(text[base]) == "Mn":  # vowel signs and selectors do not break joining
        base -= 1
    before = text[base]
    if unicodedata.bidirectional(before) == "AL" and unicodedata.bidirectional(after) == "AL":
        return True
    return unicodedata.category(before) in ("So", "Sk") and unicodedata.category(after) == "So"


def _is_variation_selector(char: str) -> bool:
    return "\ufe00" <= char <= "\ufe0f" or "\U000e0100" <= char <= "\U000e01ef" or char in "\u180b\u180c\u180d\u180f"


def _takes_variation(base: str, selector: str) -> bool:
    """Whether a selector after this base is normal: emoji and keycaps, Han ideographs, Mongolian letters."""
    if selector in "\u180b\u180c\u180d\u180f":
        return "\u1820" <= base <= "\u18aa"
    if selector in "\ufe0e\ufe0f":
        return unicodedata.category(base)[0] == "S" or base in "0123456789#*\u203c\u2049\u3030\u303d"
    return "\u3400" <= base <= "\u9fff" or "\uf900" <= base <= "\ufaff" or "\U00020000" <= base <= "\U0003ffff"
