"""Builds the Excel add-in, puts it into Excel, takes it out, and says what is there.

Excel is driven through its own automation interface: `excel` is its Application object everywhere here.
"""

from __future__ import annotations

import importlib.util
import re
import struct
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

from xleq.errors import HostError
from xleq.functions import TABLE
from xleq.hosts.excel.names import argument_description, description
from xleq.hosts.excel.vba import module_text

FILE_NAME: Final = "xleq.xlam"
_PROJECT: Final = "xleq"
_CONFIG_SHEET: Final = "xleq.conf"
_UDF_MODULE: Final = "xleq.hosts.excel.udf"
#: Excel's number for the format .xlam.
_ADD_IN_FORMAT: Final = 55
#: Oldest Excel whose function wizard shows help for arguments: 2010.
_OLDEST_EXCEL: Final = 14
_PROJECT_LINE: Final = re.compile(r'^(Public Const PROJECT_NAME As String = )".*"', re.MULTILINE)


@dataclass(frozen=True, slots=True)
class ExcelState:
    """An Excel and the add-in in it.

    Parameters
    ----------
    version : str
        For example ``16.0``.
    bits : int
        32 or 64.
    xlwings : str
        Version of xlwings in this environment.
    library : Path
        xlwings' library for an Excel of that width.
    interpreter : Path
        The Python that serves the functions.
    add_in : Path
        Where the add-in is, or would be.
    installed : bool
        Whether Excel loads it.
    """

    version: str
    bits: int
    xlwings: str
    library: Path
    interpreter: Path
    add_in: Path
    installed: bool

    def why_unfit(self) -> str:
        """Why the add-in would not work; empty where nothing speaks against it."""
        major = re.match(r"\d+", self.version)
        if not major or int(major[0]) < _OLDEST_EXCEL:
            return f"Excel {self.version} is too old; 2010 (14.0) or later is needed"
        if not self.interpreter.is_file():
            return f"there is no {self.interpreter}, which would serve the functions"
        if not self.library.is_file():
            return (
                f"xlwings' library for {self.bits}-bit Excel, {self.library}, is not there; "
                "install xlwings again in this environment"
            )
        return ""


@contextmanager
def running_excel() -> Iterator[Any]:
    """An Excel of our own, invisible, which ends with the block.

    Raises
    ------
    HostError
        If this is not Windows, or Excel does not start.
    """
    if sys.platform != "win32":
        raise HostError(
            "Excel's live functions need Excel for Windows; here `xleq recalc` and `xleq calc` work"
        )
    if importlib.util.find_spec("pywintypes") is None:
        raise HostError("pywin32 is not in this environment; install xlwings again")
    import pywintypes
    import xlwings

    try:
        app = xlwings.App(visible=False, add_book=False)
    except pywintypes.com_error as e:
        raise HostError(f"Excel does not start: {e}") from e
    try:
        app.display_alerts = False
        yield app.api
    except pywintypes.com_error as e:
        raise HostError(f"Excel refused: {e}") from e
    finally:
        app.quit()


def state(excel: Any) -> ExcelState:
    """What Excel and this environment are, and whether the add-in is installed."""
    import xlwings

    bits = 64 if "64-bit" in str(excel.OperatingSystem) else 32
    prefix = Path(sys.prefix)
    add_in = Path(str(excel.UserLibraryPath)) / FILE_NAME
    entry = _entry(excel)
    python = Path(sys.executable)
    return ExcelState(
        version=str(excel.Version),
        bits=bits,
        xlwings=str(xlwings.__version__),
        library=prefix / f"xlwings{bits}-{xlwings.__version__}.dll",
        interpreter=python.with_name("pythonw" + python.suffix),
        add_in=add_in,
        installed=entry is not None and bool(entry.Installed),
    )


def install(excel: Any) -> ExcelState:
    """Build the add-in from the table of functions and have Excel load it; an older one is replaced.

    Raises
    ------
    HostError
        If something speaks against it, or Excel does not trust us with its VBA project.
    """
    found = state(excel)
    problem = found.why_unfit()
    if problem:
        raise HostError(problem)
    _unload(excel)
    _build(excel, found)
    book = excel.Workbooks.Add()  # without an open workbook Excel takes no add-in
    try:
        excel.AddIns.Add(str(found.add_in), False).Installed = True
    finally:
        book.Close(False)
    return state(excel)


def remove(excel: Any) -> bool:
    """Have Excel no longer load the add-in, and delete its file; whether there was one."""
    found = state(excel)
    _unload(excel)
    there = found.add_in.is_file()
    found.add_in.unlink(missing_ok=True)
    return there or found.installed


def _entry(excel: Any) -> Any:
    """Excel's own entry of our add-in, None where it has none."""
    for entry in excel.AddIns:
        if str(entry.Name).lower() == FILE_NAME:
            return entry
    return None


def _unload(excel: Any) -> None:
    entry = _entry(excel)
    if entry is not None and entry.Installed:
        entry.Installed = False  # Excel lets go of the file


def _build(excel: Any, found: ExcelState) -> None:
    book = excel.Workbooks.Add()
    try:
        components = _components(book)
        with tempfile.TemporaryDirectory(prefix="xleq-") as folder:
            for name, text in (("xlwings.bas", xlwings_module()), ("xleq_functions.bas", module_text())):
                path = Path(folder) / name
                path.write_text(text, encoding="ascii", errors="replace", newline="\r\n")
                components.Import(str(path))
        sheet = book.Worksheets(1)
        sheet.Name = _CONFIG_SHEET
        for row, (key, value) in enumerate(configuration(found), 1):
            sheet.Cells(row, 1).Value = key
            sheet.Cells(row, 2).Value = value
        _register_help(excel, str(book.Name))
        found.add_in.parent.mkdir(parents=True, exist_ok=True)
        found.add_in.unlink(missing_ok=True)
        book.SaveAs(str(found.add_in), _ADD_IN_FORMAT)
    finally:
        book.Close(False)


def _components(book: Any) -> Any:
    import pywintypes

    try:
        return book.VBProject.VBComponents
    except pywintypes.com_error as e:
        raise HostError(
            "Excel does not let programs make macros: under File > Options > Trust Center > Trust Center "
            "Settings > Macro Settings tick 'Trust access to the VBA project object model' while installing"
        ) from e


def _register_help(excel: Any, book: str) -> None:
    for f in TABLE.values():
        arguments = [argument_description(a) for a in f.arguments]
        excel.MacroOptions(
            f"'{book}'!{f.name}",
            Description=description(f),
            Category=_PROJECT,
            ArgumentDescriptions=arguments or None,
        )


def configuration(found: ExcelState) -> list[tuple[str, str]]:
    """Rows of the add-in's configuration sheet, as xlwings reads it."""
    return [
        ("Interpreter_Win", str(found.interpreter)),
        ("UDF MODULES", _UDF_MODULE),
        ("Show Console", "False"),
        ("ADD_WORKBOOK_TO_PYTHONPATH", "False"),
    ]


def xlwings_module() -> str:
    """Xlwings' own VBA module, with our project's name for its settings.

    Raises
    ------
    HostError
        If this xlwings has no such module, or one of another form.
    """
    spec = importlib.util.find_spec("xlwings")
    if spec is None or spec.origin is None:
        raise HostError("xlwings is not in this environment; install it with: pip install xlwings")
    path = Path(spec.origin).with_name("xlwings_custom_addin.bas")
    if not path.is_file():
        raise HostError(f"this xlwings has no {path.name}; version 0.37.8 has")
    text, n = _PROJECT_LINE.subn(rf'\1"{_PROJECT}"', path.read_text(encoding="utf-8"))
    if n != 1:
        raise HostError(f"{path.name} of this xlwings is of another form; version 0.37.8 fits")
    return text


def python_bits() -> int:
    """Width of this Python, which may differ from Excel's: they are separate processes."""
    return 8 * struct.calcsize("P")
