"""Cell values as the XML of a cell: its `t` attribute and its `v` element."""

from __future__ import annotations

import math
from typing import Final

from xleq.cells import BLANK, STORED_ERRORS, VALUE, CellError, Value
from xleq.errors import InputError
from xleq.workbook.markup import escaped

#: The longest text that a cell holds.
MAX_TEXT: Final = 32_767


def number_text(number: float) -> str:
    """The shortest text that reads back as the same number, as Excel writes it.

    Raises
    ------
    InputError
        If it is infinite or not a number: no cell holds such a value.

    Examples
    --------
    >>> number_text(6.0), number_text(0.1), number_text(1e-5), number_text(-2.5e22), number_text(-0.0)
    ('6', '0.1', '1E-05', '-2.5E+22', '0')
    """
    if not math.isfinite(number):
        raise InputError(f"{number} is no value of a cell")
    text = repr(number)
    if text.endswith(".0"):
        return "0" if number == 0.0 else text[:-2]
    return text.replace("e", "E")


def same_value(stored: Value, fresh: Value) -> bool:
    """Whether a fresh value is stored already: same kind, and equal to the last bit.

    A newer error is stored as #VALUE!, so that a plain #VALUE! holds it already.

    Examples
    --------
    >>> from xleq.cells import SPILL
    >>> same_value(1.0, True), same_value(0.3, 0.1 + 0.2), same_value("a", "a"), same_value(VALUE, SPILL)
    (False, False, True, True)
    """
    if type(stored) is not type(fresh):
        return False
    return stored == fresh or (
        isinstance(fresh, CellError) and stored == VALUE and _code_of(fresh) == "#VALUE!"
    )


def _code_of(error: CellError) -> str:
    """The code under which the file keeps an error."""
    return error.code if error.code in STORED_ERRORS else "#VALUE!"


def markup_of(value: Value, prefix: bytes) -> tuple[bytes, bytes]:
    """The `t` attribute (with a space before it, empty for numbers) and the `v` element of a value.

    Parameters
    ----------
    value : Value
        What the cell shows.
    prefix : bytes
        Namespace prefix of the sheet's elements with its colon, usually empty.

    Raises
    ------
    InputError
        If no cell can hold the value.

    Examples
    --------
    >>> markup_of(2.5, b""), markup_of("a < b", b"x:")
    ((b'', b'<v>2.5</v>'), (b' t="str"', b'<x:v>a &lt; b</x:v>'))
    >>> markup_of(True, b""), markup_of(CellError("#SPILL!"), b""), markup_of(BLANK, b"")
    ((b' t="b"', b'<v>1</v>'), (b' t="e"', b'<v>#VALUE!</v>'), (b'', b''))
    """
    if isinstance(value, float):
        return b"", b"<%bv>%b</%bv>" % (prefix, number_text(value).encode(), prefix)
    if isinstance(value, bool):
        return b' t="b"', b"<%bv>%d</%bv>" % (prefix, value, prefix)
    if isinstance(value, str):
        space, text = _text_markup(value)
        return b' t="str"', b"<%bv%b>%b</%bv>" % (prefix, space, text, prefix)
    if isinstance(value, CellError):
        return b' t="e"', b"<%bv>%b</%bv>" % (prefix, _code_of(value).encode(), prefix)
    if value is BLANK:
        return b"", b""
    raise InputError(f"{value!r} is no value of a cell")


def constant_markup_of(value: Value, prefix: bytes) -> tuple[bytes, bytes]:
    """As `markup_of`, for a cell without a formula: text stands inline.

    Examples
    --------
    >>> constant_markup_of("30 barg", b"")
    (b' t="inlineStr"', b'<is><t>30 barg</t></is>')
    """
    if not isinstance(value, str):
        return markup_of(value, prefix)
    space, text = _text_markup(value)
    parts = (prefix, prefix, space, text, prefix, prefix)
    return b' t="inlineStr"', b"<%bis><%bt%b>%b</%bt></%bis>" % parts


def _text_markup(text: str) -> tuple[bytes, bytes]:
    if len(text) > MAX_TEXT:
        raise InputError(f"a text of {len(text)} characters is longer than the {MAX_TEXT} that a cell holds")
    edge = text != text.strip() or "\n" in text
    return b' xml:space="preserve"' if edge else b"", escaped(text).encode()
