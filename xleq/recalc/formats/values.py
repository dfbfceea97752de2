"""The section of a code that a value takes, and the value in it."""

from __future__ import annotations

from xleq.cells import Blank, CellError, Value
from xleq.errors import FormulaError, InputError
from xleq.recalc.formats.dates import date_section
from xleq.recalc.formats.numbers import general_text, number_section
from xleq.recalc.formats.sections import Section, read_code


def format_value(value: Value, code: str, date_1904: bool = False) -> str:
    """A value as a number format shows it.

    Parameters
    ----------
    value : Value
        Numbers and text are formatted; logicals and errors show as they are, a blank as nothing.
    code : str
        Format code as files hold it, in US-English notation.
    date_1904 : bool
        Date system in which a number is a date.

    Raises
    ------
    InputError
        If the code is not a number format, or the number is no date where a date is shown.
    FormulaError
        If the code asks for months, days or eras as they are in another language.

    Examples
    --------
    >>> format_value(1234.567, "#,##0.00"), format_value(0.5, "# ?/?"), format_value(-3.0, "0;(0)")
    ('1,234.57', ' 1/2', '(3)')
    >>> format_value(43831.75, "yyyy-mm-dd h:mm AM/PM"), format_value("inert", '"is "@')
    ('2020-01-01 6:00 PM', 'is inert')
    """
    if isinstance(value, float):
        return _number(value, read_code(code), date_1904)
    if isinstance(value, str):
        return _text(value, read_code(code))
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, CellError):
        return value.code
    assert isinstance(value, Blank)
    return ""


def _text(text: str, sections: tuple[Section, ...]) -> str:
    section = sections[-1]
    if len(sections) < 4 and not section.has("text"):
        return text
    return "".join(
        text if t.kind == "text" else t.text for t in section.tokens if t.kind in ("text", "literal")
    )


def _number(x: float, sections: tuple[Section, ...], date_1904: bool) -> str:
    if len(sections) == 4 or sections[-1].has("text"):
        sections = sections[:-1]
    if not sections:
        return general_text(x)
    section, unsigned = _section_for(x, sections)
    if section is None:
        if len(sections) == 1:
            return general_text(x)
        raise InputError("no section of the number format takes this number")
    if section.names_foreign:
        raise FormulaError("the format shows months, days or eras in another language than English")
    if section.is_date and not section.has("digit"):
        return date_section(abs(x) if unsigned else x, section, date_1904)
    if section.has("general"):
        general = general_text(abs(x))
        text = "".join(general if t.kind == "general" else t.text for t in section.tokens)
        shown = x != 0
    elif section.has("digit", "point"):
        text, shown = number_section(x, section)
    else:
        text, shown = "".join(t.text for t in section.tokens if t.kind != "comma"), bool(section.tokens)
    return "-" + text if x < 0 and shown and not unsigned else text


def _section_for(x: float, sections: tuple[Section, ...]) -> tuple[Section | None, bool]:
    """The section that takes a number, and whether it stands for the minus sign as well."""
    first = sections[0]
    if len(sections) == 1:
        if first.condition is None or first.condition.holds(x):
            return first, first.condition is not None and first.condition.only_negative
        return None, False
    second = sections[1]
    if first.condition is not None:
        takes_first = first.condition.holds(x)
    else:
        takes_first = x > 0 or (x == 0 and len(sections) == 2 and second.condition is None)
        if second.condition is not None and len(sections) == 2:
            takes_first = not second.condition.holds(x)
    if takes_first:
        return first, first.condition is not None and first.condition.only_negative
    if second.condition is not None:
        takes_second, unsigned = second.condition.holds(x), second.condition.only_negative
    elif first.condition is not None:
        takes_second = len(sections) == 2 or x < 0
        unsigned = len(sections) > 2 or all(first.condition.holds(v) for v in (0.0, 1e-300, 1e300))
    else:
        takes_second, unsigned = x < 0, True
    if takes_second:
        return second, unsigned
    return (sections[2], False) if len(sections) > 2 else (None, False)
