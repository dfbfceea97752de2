"""Every published difference from Excel is what xleq shows, and the page is current."""

from __future__ import annotations

import pytest

from tests.recalc.books import NOW
from tests.recalc.corpus import CORPUS
from tests.recalc.differences import PAGE, Difference, page, shown
from tests.recalc.differences_known import TOPICS
from xleq.cells import CellAddress, parse_address
from xleq.recalc import recalculate
from xleq.workbook import open_book

ROWS = [d for rows in TOPICS.values() for d in rows]


@pytest.mark.parametrize("d", ROWS, ids=lambda d: d.formula[:60])
def test_xleq_shows_what_the_page_says(d: Difference) -> None:
    assert d.evaluated() == d.xleq


@pytest.mark.parametrize("d", ROWS, ids=lambda d: d.formula[:60])
def test_every_difference_has_a_reason_and_a_source(d: Difference) -> None:
    assert d.why
    assert bool(d.source) != bool(d.stored)
    assert d.excel != d.xleq


@pytest.mark.skipif(not CORPUS.is_dir(), reason="the corpus of workbooks is not beside the project")
@pytest.mark.parametrize("d", [d for d in ROWS if d.stored], ids=lambda d: d.formula[:60])
def test_excel_stored_what_the_page_says_and_xleq_differs_there(d: Difference) -> None:
    assert d.stored is not None
    file, name, cell = d.stored
    made = open_book(next(CORPUS.glob(f"**/{file}")))
    sheet, place = made.sheet_named(name), parse_address(cell)
    assert sheet is not None
    assert shown(sheet.stored[place]) == d.excel
    done = recalculate(made, {}, now=NOW, trust_fresh=False)
    address = CellAddress(sheet.name, *place)
    here = [f"kept: {k.reason}" for k in done.kept if k.address == address]
    here += [shown(x.fresh) for x in done.disagreements if x.address == address]
    if not here:  # Excel's Bessel functions are within the tolerance of the check
        assert "BESSEL" in d.formula
    assert all(text in d.xleq for text in here)


def test_the_page_is_current() -> None:
    assert PAGE.read_text("utf-8") == page(), "run: python -m tests.recalc.differences"
