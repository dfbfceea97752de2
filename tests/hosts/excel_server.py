"""Serves calls through the real xlwings on top of the pywin32 stand-in: a JSON line in, a JSON line out.

Run by `SimulatedExcel`, in a process of its own.
"""

from __future__ import annotations

import json
import sys
from datetime import datetime
from decimal import Decimal
from pathlib import Path
from typing import Any
from unittest.mock import MagicMock

sys.path.insert(0, str(Path(__file__).parent))
import pywin32_stand_in as stand_in

MODULE = "xleq.hosts.excel.udf"


def cell(told: Any) -> Any:
    """A cell's value as pywin32 gives it."""
    if isinstance(told, dict):
        kind, text = next(iter(told.items()))
        return {
            "error": lambda: stand_in.ERRORS[text],
            "decimal": lambda: Decimal(text),
            "date": lambda: datetime.fromisoformat(text),
        }[kind]()
    return told


def argument(told: Any) -> Any:
    """What VBA passes on: a value, a range, an array of values, or nothing."""
    if isinstance(told, dict):
        if "missing" in told:
            return stand_in.MISSING
        if "range" in told:
            return stand_in.cells(*([cell(v) for v in row] for row in told["range"]))
        if "array" in told:
            return tuple(tuple(cell(v) for v in row) for row in told["array"])
    return cell(told)


def import_udfs() -> dict[str, Any]:
    """What xlwings writes into a workbook on "Import Functions", and the help it registers."""
    from xlwings import udfs

    book = MagicMock()
    book.Name = "book.xlsm"
    book.Worksheets = []
    book.Application.Version = "16.0"
    written = []
    book.VBProject.VBComponents.Import = lambda path: written.append(Path(path).read_text("utf-8"))
    udfs.import_udfs(MODULE, book)
    options = [
        {"macro": call.args[0], "help": call.kwargs["Description"], "category": call.kwargs["Category"]}
        | {"arguments": call.kwargs["ArgumentDescriptions"]}
        for call in book.Application.MacroOptions.call_args_list
    ]
    return {"vba": written[0], "options": options}


def main() -> None:
    """Answer until the input ends."""
    server = stand_in.install()
    sys.stdout.write("ready\n")
    sys.stdout.flush()
    for line in sys.stdin:
        asked = json.loads(line)
        if asked == "import":
            real, sys.stdout = sys.stdout, sys.stderr  # xlwings prints
            answer: Any = import_udfs()
            sys.stdout = real
        else:
            name, arguments = asked
            found = server.CallUDF(MODULE, name, tuple(map(argument, arguments)), None, MagicMock())
            answer = stand_in.array(found)
        sys.stdout.write(json.dumps(answer) + "\n")
        sys.stdout.flush()


if __name__ == "__main__":
    main()
