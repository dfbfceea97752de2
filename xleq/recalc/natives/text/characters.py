"""Text: joining, cutting, case, characters.

Characters are counted as the spreadsheet counts them, in UTF-16 units; the functions whose name ends in B
count the same in a locale without double-byte characters.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

from xleq.cells import BLANK, NA, VALUE, CellError, Missing, Value
from xleq.recalc.coerce import to_text
from xleq.recalc.context import Context
from xleq.recalc.natives.table import native
from xleq.recalc.operands import Area, Argument, Array, Fail, Operand, Ref

#: Most characters of a cell.
LONGEST: Final = 32_767


def is_narrow(text: str) -> bool:
    """Whether every character is one UTF-16 unit."""
    return text.isascii() or max(text) <= "\uffff"


def length(text: str) -> int:
    """Number of UTF-16 units.

    Examples
    --------
    >>> length("NH₃"), length("🙂")
    (3, 2)
    """
    return len(text) if is_narrow(text) else len(text.encode("utf-16-le", "surrogatepass")) // 2


def piece(text: str, start: int, stop: int) -> str:
    """The units from `start` to before `stop`, both from 0; half a character becomes U+FFFD."""
    if is_narrow(text):
        return text[start:stop]
    units = text.encode("utf-16-le", "surrogatepass")
    return units[2 * start : 2 * stop].decode("utf-16-le", "replace")


def fitting(text: str) -> str:
    """The text, if a cell can hold it."""
    if len(text) > LONGEST:
        raise Fail(CellError("#VALUE!", f"the text is longer than {LONGEST} characters"))
    return text


def as_text(value: Value) -> str:
    """Text of a value; an error stops the function."""
    text = to_text(value)
    if isinstance(text, CellError):
        raise Fail(text)
    return text


def listed(arguments: tuple[Argument, ...]) -> list[Value]:
    """All values of arguments of the kind list, in order."""
    values: list[Value] = []
    for argument in arguments:
        if isinstance(argument, Array):
            values += argument.flat
        elif isinstance(argument, Missing):
            values.append(BLANK)
        else:
            assert not isinstance(argument, Ref)
            assert not callable(argument)
            values.append(argument)
    return values


@native("CONCATENATE", "text*")
def concatenate(*texts: str) -> str:
    """Texts joined."""
    return fitting("".join(texts))


@native("CONCAT", "list*")
def concat(*arguments: Argument) -> str:
    """Texts, and those of all cells of ranges, joined."""
    return fitting("".join(as_text(v) for v in listed(arguments)))


@native("TEXTJOIN", "list logical list*")
def textjoin(delimiter: Argument, ignore_empty: bool, *arguments: Argument) -> str:
    """Texts joined with delimiters, which take turns."""
    delimiters = [as_text(v) for v in listed((delimiter,))] or [""]
    texts = [as_text(v) for v in listed(arguments)]
    if ignore_empty:
        texts = [t for t in texts if t]
    out: list[str] = []
    for i, text in enumerate(texts):
        if i:
            out.append(delimiters[(i - 1) % len(delimiters)])
        out.append(text)
    return fitting("".join(out))


def _count(number: float) -> int:
    if number < 0:
        raise Fail(CellError("#VALUE!", "a number of characters is negative"))
    return int(min(number, LONGEST + 1))


@native("LEFT LEFTB", "text number?")
def left(text: str, count: float = 1.0) -> str:
    """First characters."""
    return piece(text, 0, _count(count))


@native("RIGHT RIGHTB", "text number?")
def right(text: str, count: float = 1.0) -> str:
    """Last characters."""
    n, size = _count(count), length(text)
    return piece(text, max(size - n, 0), size)


@native("MID MIDB", "text number number")
def mid(text: str, start: float, count: float) -> str:
    """Characters from a position on."""
    first = _position(start)
    return piece(text, first, first + _count(count))


def _position(start: float) -> int:
    if start < 1:
        raise Fail(CellError("#VALUE!", "a position is less than 1"))
    return int(min(start, LONGEST + 1)) - 1


@native("REPLACE REPLACEB", "text number number text")
def replace(text: str, start: float, count: float, new: str) -> str:
    """Text with the characters at a place replaced."""
    first = _position(start)
    last = first + _count(count)
    return fitting(piece(text, 0, first) + new + piece(text, last, max(length(text), last)))


@native("LEN LENB", "text")
def len_(text: str) -> float:
    """Number of characters."""
    return float(length(text))


@native("LOWER", "text")
def lower(text: str) -> str:
    """Lower case."""
    return text.lower()


@native("UPPER", "text")
def upper(text: str) -> str:
    """Upper case; characters that would become two stay."""
    if text.isascii():
        return text.upper()
    return "".join(c.upper() if len(c.upper()) == 1 else c for c in text)


@native("PROPER", "text")
def proper(text: str) -> str:
    """A capital after every character that is no letter."""
    out: list[str] = []
    inside = False
    for c in text:
        out.append(c.lower() if inside else upper(c))
        inside = c.isalpha()
    return "".join(out)


@native("TRIM", "text")
def trim(text: str) -> str:
    """Without blanks at the ends and with single blanks inside."""
    return " ".join(word for word in text.split(" ") if word)


@native("CLEAN", "text")
def clean(text: str) -> str:
    """Without control characters."""
    return "".join(c for c in text if c >= " ")


@native("REPT", "text number")
def rept(text: str, times: float) -> str:
    """Text repeated."""
    n = _count(times)
    if len(text) * n > LONGEST:
        raise Fail(CellError("#VALUE!", f"the text would be longer than {LONGEST} characters"))
    return text * n


@native("EXACT", "text text")
def exact(a: str, b: str) -> bool:
    """Whether two texts are the same in every character."""
    return a == b


@native("CHAR", "number")
def char(code: float) -> str:
    """Character of a Windows-1252 code."""
    if not 1 <= code < 256:
        raise Fail(CellError("#VALUE!", "a character code is 1 to 255"))
    byte = bytes([int(code)])
    try:
        return byte.decode("cp1252")
    except UnicodeDecodeError:  # five codes stand for themselves
        return chr(int(code))


@native("CODE", "text")
def code(text: str) -> float:
    """Windows-1252 code of the first character; 63 where it has none."""
    if not text:
        raise Fail(VALUE)
    first = text[0]
    try:
        return float(first.encode("cp1252")[0])
    except UnicodeEncodeError:
        return float(ord(first)) if ord(first) < 256 else 63.0


@native("UNICHAR", "number")
def unichar(code_point: float) -> str:
    """Character of a Unicode code point."""
    n = int(code_point)
    if n < 1 or n > 0x10FFFF:
        raise Fail(VALUE)
    if 0xD800 <= n <= 0xDFFF or n & 0xFFFE == 0xFFFE:
        raise Fail(NA)
    return chr(n)


@native("UNICODE", "text")
def unicode(text: str) -> float:
    """Unicode code point of the first character."""
    if not text:
        raise Fail(VALUE)
    return float(ord(text[0]))


@native("T", "operand", context=True)
def t(context: Context, argument: Argument) -> Operand:
    """The value if it is text, else empty text."""
    return first_or_each(context, argument, lambda v: v if isinstance(v, str | CellError) else "")


def first_or_each(context: Context, argument: Argument, call: Callable[[Value], Value]) -> Operand:
    """The function of the first cell of a reference, of each element of an array, or of a value."""
    if isinstance(argument, Ref):
        area = argument.areas[0]
        cell = Area(area.sheet, area.top, area.left, area.top, area.left)
        argument = context.read(Ref((cell,))).flat[0]
    if isinstance(argument, Array):
        return Array(argument.height, argument.width, [call(v) for v in argument.flat])
    assert not callable(argument)
    return call(BLANK if isinstance(argument, Missing) else argument)
