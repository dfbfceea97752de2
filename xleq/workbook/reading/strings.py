"""Shared strings: the texts that sheets refer to by number."""

from __future__ import annotations

from xleq.errors import LimitError
from xleq.workbook.markup import bare, feed, new_parser, unescaped
from xleq.workbook.package import Package


class _Reader:
    """Collects the text of each item: all its runs, without phonetic hints."""

    def __init__(self, depth: int) -> None:
        self._depth_left = depth
        self.strings: list[str] = []
        self._runs: list[str] = []
        self._text = ""
        self._phonetic = 0

    def start(self, name: str, _: dict[str, str]) -> None:
        self._depth_left -= 1
        if self._depth_left < 0:
            raise LimitError("has too many elements inside one another (xml_depth)")
        local = bare(name)
        if local == "si":
            self._runs = []
        elif local == "rPh":
            self._phonetic += 1
        self._text = ""

    def characters(self, text: str) -> None:
        self._text += text

    def end(self, name: str) -> None:
        self._depth_left += 1
        local = bare(name)
        if local == "t":
            if not self._phonetic:
                self._runs.append(self._text)
        elif local == "rPh":
            self._phonetic -= 1
        elif local == "si":
            self.strings.append(unescaped("".join(self._runs)))


def read_strings(package: Package, part: str) -> list[str]:
    """Every shared string of a workbook, decoded, in its order.

    Raises
    ------
    DamagedBookError, LimitError
        If the part is missing or not well-formed, or nested too deep.
    """
    reader = _Reader(package.limits.xml_depth)
    parser = new_parser()
    parser.StartElementHandler = reader.start
    parser.EndElementHandler = reader.end
    parser.CharacterDataHandler = reader.characters
    feed(parser, part, package.read(part))
    return reader.strings
