"""Criteria such as ``">=5"``, ``"N2*"`` or a plain value: what they mean and which cells meet them.

A criterion that names a number is met by that number and by text that reads as it; ``<>`` counts such text
as different. Text is compared without case, with ``*`` and ``?`` as wildcards and ``~`` before one that is
meant itself. ``"="`` means blank, ``"<>"`` not blank, ``""`` blank or empty text. Orders compare numbers with
numbers and text with text only.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Final, Literal

from xleq.cells import BLANK, ERRORS, VALUE, CellError, Value
from xleq.recalc.coerce import collation_key
from xleq.recalc.operands import BLANK_KIND, TEXT_KIND, Array, Fail
from xleq.recalc.patterns import has_wildcard, wildcard_pattern
from xleq.recalc.texts import Calendar, calendar, parse_number

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

Relation = Literal["=", "<>", "<", ">", "<=", ">="]

_OPERATOR = re.compile(r"(<=|>=|<>|=|<|>)?(.*)", re.DOTALL)
_LONGEST: Final = 255


@dataclass(frozen=True, slots=True)
class Criterion:
    """A criterion, read.

    Parameters
    ----------
    relation : str
    operand : Value
        `BLANK` where the criterion is a bare operator.
    text : callable
        Whether a text meets the criterion apart from ``<>``, which turns the answer.
    blank : bool
        Whether a blank meets it.
    """

    relation: Relation
    operand: Value
    text: Callable[[str], bool]
    blank: bool

    def met_by(self, value: Value) -> bool:
        """Whether a value meets the criterion."""
        if value is BLANK:
            return self.blank
        if self.relation == "<>":
            return not self._equal(value)
        if self.relation == "=":
            return self._equal(value)
        if type(value) is str:
            return self.text(value)
        operand = self.operand
        if type(value) is not type(operand) or not isinstance(operand, float | bool):
            return False
        return _ordered(self.relation, value, operand)  # type: ignore[arg-type]

    def _equal(self, value: Value) -> bool:
        if type(value) is str:
            return self.text(value)
        return type(value) is type(self.operand) and value == self.operand

    def mask(self, array: Array) -> NDArray[np.bool_]:
        """Which elements meet the criterion, as bool [height, width]."""
        met = self._plain_mask(array)
        return ~met if self.relation == "<>" else met

    def _plain_mask(self, array: Array) -> NDArray[np.bool_]:
        import numpy as np

        operand, kinds = self.operand, array.kinds
        met: NDArray[np.bool_]
        if type(operand) is float:
            with np.errstate(invalid="ignore"):
                met = _COMPARE[self.relation](array.numbers, operand)
            if self.relation != "=":
                return met
        else:
            met = np.zeros(kinds.shape, bool)
            if self.relation in ("=", "<>") and self.blank != (self.relation == "<>"):
                met |= kinds == BLANK_KIND
            if isinstance(operand, bool | CellError):
                for i, value in enumerate(array.flat):
                    if type(value) is type(operand) and self._plainly_met(value):
                        met.flat[i] = True
        if self.text is not _never and (kinds == TEXT_KIND).any():
            return met | self._text_mask(array)
        return met

    def _text_mask(self, array: Array) -> NDArray[np.bool_]:
        """Which texts meet the criterion; each distinct text is tested once."""
        import numpy as np

        (words, lexicon), operand = array.words(), self.operand
        met: NDArray[np.bool_]
        if type(operand) is float:
            met = np.zeros(words.shape, bool)
            for number in lexicon.reading_as(operand):
                met |= words == number
            return met
        if type(operand) is str and self.relation in ("=", "<>") and not has_wildcard(operand):
            number = lexicon.find(operand)
            met = words == (number if number >= 0 else -2)
            return met
        answers = lexicon.meeting((self.relation, operand), self.text)
        return (words >= 0) & answers[words]

    def _plainly_met(self, value: Value) -> bool:
        met = self.met_by(value)
        return not met if self.relation == "<>" else met


def _ordered(relation: Relation, a: float, b: float) -> bool:
    if relation == "<":
        return a < b
    if relation == ">":
        return a > b
    return a <= b if relation == "<=" else a >= b


_COMPARE: Final[dict[Relation, Callable[..., NDArray[np.bool_]]]] = {
    "=": lambda a, b: a == b,
    "<>": lambda a, b: a == b,
    "<": lambda a, b: a < b,
    ">": lambda a, b: a > b,
    "<=": lambda a, b: a <= b,
    ">=": lambda a, b: a >= b,
}


def _never(_text: str) -> bool:
    return False


def text_test(text: str) -> Callable[[str], bool]:
    """Test whether a text equals this one, without case and with wildcards."""
    if has_wildcard(text):
        pattern = wildcard_pattern(text)
        return lambda other: pattern.fullmatch(other) is not None
    wanted = text.lower()
    return lambda other: other.lower() == wanted


def _reads_as(number: float) -> Callable[[str], bool]:
    return lambda text: any(c.isdigit() for c in text) and parse_number(text) == number


def _text_order(relation: Relation, text: str) -> Callable[[str], bool]:
    key = collation_key(text)
    if relation == "<":
        return lambda other: collation_key(other) < key
    if relation == ">":
        return lambda other: collation_key(other) > key
    if relation == "<=":
        return lambda other: collation_key(other) <= key
    return lambda other: collation_key(other) >= key


def _operand(text: str) -> Value:
    number = parse_number(text)
    if number is not None:
        return number
    upper = text.upper()
    if upper in ("TRUE", "FALSE"):
        return upper == "TRUE"
    return ERRORS.get(upper, text)


def read_criterion(value: Value) -> Criterion:
    """The criterion that a value stands for.

    Raises
    ------
    Fail
        #VALUE! for text of more than 255 characters.

    Examples
    --------
    >>> [read_criterion(c).met_by("23") for c in (">5", "=23", "<>23")]
    [False, True, True]
    """
    return _read(value, calendar())


@lru_cache(maxsize=4096, typed=True)
def _read(value: Value, _: Calendar) -> Criterion:
    # the calendar is there for the cache: a date in the text is another number in another calendar
    if value is BLANK:
        value = 0.0
    if not isinstance(value, str):
        return Criterion("=", value, _reads_as(value) if type(value) is float else _never, False)
    if len(value) > _LONGEST:
        raise Fail(VALUE)
    match = _OPERATOR.fullmatch(value)
    assert match is not None
    relation: Relation = match[1] or "="  # type: ignore[assignment]
    if not match[2]:
        return _bare(match[1])
    operand = _operand(match[2])
    blank = relation == "<>"
    if type(operand) is str:
        test = text_test(operand) if relation in ("=", "<>") else _text_order(relation, operand)
        return Criterion(relation, operand, test, blank)
    if type(operand) is float and relation == "=":
        return Criterion(relation, operand, _reads_as(operand), blank)
    return Criterion(relation, operand, _never, blank)


def _bare(operator: str | None) -> Criterion:
    if operator is None:
        return Criterion("=", "", lambda text: text == "", True)
    if operator == "<>":
        return Criterion("<>", BLANK, _never, False)
    if operator == "=":
        return Criterion("=", BLANK, _never, True)
    return Criterion(operator, "", _never, False)  # type: ignore[arg-type]
