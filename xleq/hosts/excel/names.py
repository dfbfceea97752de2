"""Names and help texts that VBA and Excel's function wizard accept."""

from __future__ import annotations

from typing import Final

from xleq.functions import Argument, Function
from xleq.hosts.wording import argument_help

#: Most characters of a function's or an argument's description in the function wizard.
LONGEST_HELP: Final = 255

#: The language's reserved identifiers, and the one name that xlwings keeps for itself.
RESERVED: Final = frozenset({
    "addressof", "and", "any", "array", "as", "attribute", "boolean", "byref", "byte", "byval", "call",
    "case", "cdecl", "circle", "close", "const", "currency", "date", "debug", "decimal", "declare",
    "defbool", "defbyte", "defcur", "defdate", "defdbl", "defdec", "defint", "deflng", "deflnglng",
    "deflngptr", "defobj", "defsng", "defstr", "defvar", "dim", "do", "doevents", "double", "each",
    "else", "elseif", "empty", "end", "endif", "enum", "eqv", "erase", "event", "exit", "false", "fix",
    "for", "friend", "function", "get", "global", "gosub", "goto", "if", "imp", "implements", "in",
    "input", "inputb", "int", "integer", "is", "lbound", "len", "lenb", "let", "like", "lock", "long",
    "longlong", "longptr", "loop", "lset", "me", "mod", "new", "next", "not", "nothing", "null", "on",
    "open", "option", "optional", "or", "paramarray", "preserve", "print", "private", "property",
    "pset", "public", "put", "raiseevent", "redim", "rem", "resume", "return", "rset", "scale", "seek",
    "select", "set", "sgn", "shared", "single", "spc", "static", "stop", "string", "sub", "tab",
    "then", "to", "true", "type", "typeof", "ubound", "unlock", "until", "variant", "wend", "while",
    "with", "withevents", "write", "xor", "caller",
})  # fmt: skip


def vba_name(argument: Argument) -> str:
    """The argument's name in VBA: its own, or with an underscore where that is a word of the language.

    Examples
    --------
    >>> vba_name(Argument("property", "text", "")), vba_name(Argument("species", "text", ""))
    ('property_', 'species')
    """
    return f"{argument.name}_" if argument.name.lower() in RESERVED else argument.name


def description(function: Function) -> str:
    """What a function gives, in at most 255 characters."""
    return _cut(function.gives)


def argument_description(argument: Argument) -> str:
    """What an argument means, in at most 255 characters."""
    text = argument_help(argument)
    return text if len(text) <= LONGEST_HELP else _cut(argument.meaning)


def _cut(text: str) -> str:
    return text if len(text) <= LONGEST_HELP else text[: LONGEST_HELP - 1] + "…"
