"""Formulas that were filled right or down, told by their text alone."""

from __future__ import annotations

import re

from xleq.cells import column_number


def relative_key(text: str, row: int, column: int) -> str:
    r"""Text with its relative references as distances from a cell: equal texts have equal trees.

    Examples
    --------
    >>> relative_key("A1+$B$2&\"A1\"", 1, 1) == relative_key("B2+$B$2&\"A1\"", 2, 2)
    True
    >>> relative_key("SUM(A:A)", 1, 2) == relative_key("SUM(A:A)", 1, 3)
    False
    """

    def shift(match: re.Match[str]) -> str:
        own = match[0]
        if match[1] is None:
            return own
        parts = []
        for end in own.split(":"):
            letters = end.strip("$0123456789")
            digits = end[end.index(letters) + len(letters) :] if letters else end
            part = ""
            if letters:
                part = f"${letters}" if end[0] == "$" else f"<{column_number(letters) - column}"
            if digits:
                part += digits if digits[0] == "$" else f">{int(digits) - row}"
            parts.append(part)
        return ":".join(parts)

    return _SHIFTED.sub(shift, text)


def row_template(text: str, row: int) -> tuple[str, tuple[int, ...]]:
    """Text with the rows of its relative references left open, and their distances from a row.

    A formula in the same column whose text is the template filled with its own row has the same tree.

    Examples
    --------
    >>> row_template('A2*$B$1&"50%"', 2)
    ('A%d*$B$1&"50%%"', (0,))
    """
    parts: list[str] = []
    distances: list[int] = []
    end = 0
    for match in _SHIFTED.finditer(text):
        if match[1] is None:
            continue
        for number in _OPEN_ROW.finditer(text, match.start(), match.end()):
            parts.append(text[end : number.start()].replace("%", "%%") + "%d")
            distances.append(int(number[0]) - row)
            end = number.end()
    parts.append(text[end:].replace("%", "%%"))
    return "".join(parts), tuple(distances)


_OPEN_ROW = re.compile(r"(?<![$0-9])[0-9]+")
_SHIFTED = re.compile(
    r"""
    "(?:[^"]|"")*" | '(?:[^']|'')*' | \[(?:[^\[\]']|'.|\[(?:[^\[\]']|'.)*\])*\]
  | (?<![\w.$\\?])(
        \$?[A-Za-z]{1,3}\$?[1-9][0-9]{0,6}(?![\w.(!\[?\\])
      | \$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}(?![\w.($!\[])
      | \$?[0-9]{1,7}:\$?[0-9]{1,7}(?![\w.])
    )
    """,
    re.VERBOSE,
)
