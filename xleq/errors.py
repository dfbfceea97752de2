"""Every error that xleq raises, in one tree.

XleqError
├── InputError              what was given cannot be read            → #VALUE!
│   ├── ParseError          text: what was expected, and where
│   ├── UnitError           a unit is unknown or measures another quantity
│   └── BalanceError        a reaction does not conserve elements or charge
├── NoAnswerError           well read, but there is no such answer   → #NUM!
│   ├── OutOfRangeError     outside the range of a model, a method or physics
│   ├── AmbiguousError      there is more than one answer
│   └── NotCertifiedError   a result was found but failed its certificate
├── MissingDataError        a datum is not in the table              → #N/A
├── FormulaError            spreadsheet formula text that cannot be used
├── HostError               a spreadsheet program is absent, or cannot take the add-in
└── BookError               a workbook that is refused; nothing is written
    ├── MissingBookError    there is no such file
    ├── LockedBookError     it is open elsewhere or cannot be written
    ├── EncryptedBookError  it needs a password
    ├── SignedBookError     a change would break its signature
    ├── DamagedBookError    it is not a readable workbook
    └── LimitError          it is over a limit set against hostile files

Each class has a stable `code`, and `cell`, the spreadsheet error it becomes in a cell.
"""


class XleqError(Exception):
    """Base of every error that xleq raises on purpose."""

    code = "error"
    cell = "#VALUE!"


class InputError(XleqError):
    """What was given cannot be read."""

    code = "input"


class ParseError(InputError):
    """Text that does not follow its grammar.

    Parameters
    ----------
    text : str
        The whole text.
    at : int
        Position of the first character that does not fit, from 0.
    wanted : str
        What was expected there.
    """

    code = "parse"

    def __init__(self, text: str, at: int, wanted: str) -> None:
        super().__init__(text, at, wanted)
        self.text, self.at, self.wanted = text, at, wanted

    def __str__(self) -> str:
        found = f", found {self.text[self.at]!r}" if self.at < len(self.text) else ", found the end"
        return f"expected {self.wanted} at position {self.at + 1} of {self.text!r}{found}"


class UnitError(InputError):
    """A unit is unknown, or measures another quantity than is wanted."""

    code = "unit"


class BalanceError(InputError):
    """A reaction does not conserve elements or charge."""

    code = "balance"


class NoAnswerError(XleqError):
    """The input is well formed, but there is no such answer."""

    code = "no-answer"
    cell = "#NUM!"


class OutOfRangeError(NoAnswerError):
    """A value lies outside the range of a model, a method or physics."""

    code = "out-of-range"


class AmbiguousError(NoAnswerError):
    """There is more than one answer, and nothing to choose by."""

    code = "ambiguous"


class NotCertifiedError(NoAnswerError):
    """A result was found, but it failed its certificate and is not given."""

    code = "not-certified"


class MissingDataError(XleqError):
    """A datum that is needed is not in the table."""

    code = "missing-data"
    cell = "#N/A"


class FormulaError(XleqError):
    """A spreadsheet formula cannot be parsed, or uses something unsupported."""

    code = "formula"


class HostError(XleqError):
    """A spreadsheet program is absent, unfit, or would not take the add-in."""

    code = "host"


class BookError(XleqError):
    """A workbook is refused; nothing has been written."""

    code = "book"


class MissingBookError(BookError):
    """There is no such file."""

    code = "book-missing"


class LockedBookError(BookError):
    """The workbook is open elsewhere, or its folder or file cannot be written."""

    code = "book-locked"


class EncryptedBookError(BookError):
    """The workbook needs a password."""

    code = "book-encrypted"


class SignedBookError(BookError):
    """The workbook carries a digital signature that a change would break."""

    code = "book-signed"


class DamagedBookError(BookError):
    """The file is not a readable workbook."""

    code = "book-damaged"


class LimitError(BookError):
    """The workbook is over a limit set against hostile files."""

    code = "book-limit"
