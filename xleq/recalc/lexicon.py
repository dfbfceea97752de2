"""The distinct texts of a column or an array, numbered, and which of them meet a criterion."""

from __future__ import annotations

from collections.abc import Callable, Hashable
from typing import TYPE_CHECKING, Final

from xleq.recalc.texts import parse_number

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

#: Answers to so many different criteria are remembered.
_REMEMBERED: Final = 64


class Lexicon:
    """Distinct texts without regard to case, numbered from 0 as they are added.

    Examples
    --------
    >>> words = Lexicon()
    >>> [words.add(t) for t in ("NH3", "n2", "nh3", "12")], words.find("N2"), words.find("Ar")
    ([0, 1, 0, 2], 1, -1)
    >>> words.reading_as(12.0), words.meeting("n*", lambda text: text.startswith("n")).tolist()
    ([2], [True, True, False])
    """

    __slots__ = ("_answers", "_numbers", "_numbers_of", "_numerals", "_texts")

    def __init__(self) -> None:
        self._numbers: dict[str, int] = {}
        self._texts: list[str] = []
        self._numerals: dict[float, list[int]] = {}
        self._numbers_of = 0
        self._answers: dict[Hashable, list[bool]] = {}

    def add(self, text: str) -> int:
        """Number of a text, a new one where it is new."""
        key = text.lower()
        number = self._numbers.get(key)
        if number is None:
            number = self._numbers[key] = len(self._texts)
            self._texts.append(key)
        return number

    def find(self, text: str) -> int:
        """Number of a text; -1 for one that was never added."""
        return self._numbers.get(text.lower(), -1)

    def reading_as(self, number: float) -> list[int]:
        """Numbers of the texts that stand for a number."""
        for i in range(self._numbers_of, len(self._texts)):
            text = self._texts[i]
            value = parse_number(text) if any(c.isdigit() for c in text) else None
            if value is not None:
                self._numerals.setdefault(value, []).append(i)
        self._numbers_of = len(self._texts)
        return self._numerals.get(number, [])

    def meeting(self, key: Hashable, test: Callable[[str], bool]) -> NDArray[np.bool_]:
        """Whether each text, by its number, passes a test; answers are remembered under `key`."""
        import numpy as np

        answers = self._answers.get(key)
        if answers is None:
            if len(self._answers) >= _REMEMBERED:
                self._answers.clear()
            answers = self._answers[key] = []
        answers.extend(test(text) for text in self._texts[len(answers) :])
        return np.array(answers, bool)
