"""Workbooks made byte by byte, so that each test says exactly what its file holds."""

from __future__ import annotations

import os
import zipfile
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path

import pytest

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
LINKS = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"

BookMaker = Callable[..., Path]


def relationships(links: Mapping[str, tuple[str, str]]) -> str:
    """A relationships part: id → (type, target); a target with a scheme lies outside."""
    rows = "".join(
        f'<Relationship Id="{key}" Type="{kind if ":" in kind else f"{LINKS}/{kind}"}" Target="{target}"'
        f"{' TargetMode=' + chr(34) + 'External' + chr(34) if '://' in target else ''}/>"
        for key, (kind, target) in links.items()
    )
    return f'<Relationships xmlns="{PACKAGE}">{rows}</Relationships>'


def write_parts(path: Path, parts: Mapping[str, str | bytes], comment: bytes = b"") -> Path:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.comment = comment
        for name, content in parts.items():
            archive.writestr(name, content)
    return path


@pytest.fixture
def make_book(tmp_path: Path) -> BookMaker:
    """Build a workbook: sheets as {name: XML inside `worksheet`}, more parts and links as needed."""

    def make(
        sheets: Mapping[str, str | bytes],
        name: str = "loop.xlsx",
        after_sheets: str = "",
        before_sheets: str = "",
        links: Mapping[str, tuple[str, str]] | None = None,
        parts: Mapping[str, str | bytes] | None = None,
        states: Mapping[str, str] | None = None,
        application: str = "Microsoft Excel",
    ) -> Path:
        rows, own_links, sheet_parts = "", dict(links or {}), {}
        for n, (title, inside) in enumerate(sheets.items(), 1):
            state = f' state="{states[title]}"' if states and title in states else ""
            rows += f'<sheet name="{title}" sheetId="{n}"{state} r:id="s{n}"/>'
            own_links[f"s{n}"] = ("worksheet", f"worksheets/sheet{n}.xml")
            sheet_parts[f"xl/worksheets/sheet{n}.xml"] = (
                inside
                if isinstance(inside, bytes)
                else f'<worksheet xmlns="{MAIN}" xmlns:r="{LINKS}">{inside}</worksheet>'
            )
        every: dict[str, str | bytes] = {
            "_rels/.rels": relationships(
                {"a": ("officeDocument", "xl/workbook.xml"), "b": ("extended-properties", "docProps/app.xml")}
            ),
            "docProps/app.xml": (
                '<Properties xmlns="http://schemas.openxmlformats.org/officeDocument/2006/extended-properties">'
                f"<Application>{application}</Application></Properties>"
            ),
            "xl/workbook.xml": (
                f'<workbook xmlns="{MAIN}" xmlns:r="{LINKS}">{before_sheets}'
                f"<sheets>{rows}</sheets>{after_sheets}</workbook>"
            ),
            "xl/_rels/workbook.xml.rels": relationships(own_links),
            **sheet_parts,
            **(parts or {}),
        }
        return write_parts(tmp_path / name, every, comment=b"kept")

    return make


@pytest.fixture
def ordinary_user() -> Iterator[None]:
    """Run as somebody whom permissions bind."""
    if os.name != "posix":
        pytest.skip("permissions of POSIX systems")
    if os.geteuid() != 0:
        yield
        return
    os.seteuid(65534)
    try:
        yield
    finally:
        os.seteuid(0)
