"""Workbooks that Excel saved: how many of its values come out, and that none is silently different."""

from __future__ import annotations

import pytest

from tests.recalc.corpus import CORPUS, Tally, examine
from xleq.errors import BookError
from xleq.workbook import open_book

pytestmark = [
    pytest.mark.slow,
    pytest.mark.skipif(not CORPUS.is_dir(), reason="the corpus of workbooks is not beside the project"),
]


def total(folder: str, only_excel: bool) -> Tally:
    """Counts over the files of a folder; those that are refused with a clear error are left out."""
    found = Tally()
    for path in sorted((CORPUS / folder).glob("**/*.xls[xm]")):
        try:
            book = open_book(path)
        except BookError:
            continue
        if not only_excel or book.application == "Microsoft Excel":
            found.add(examine(book))
    return found


@pytest.mark.parametrize(
    ("folder", "only_excel", "cells", "share"), [("ironcalc", False, 8000, 99.0), ("poi", True, 1200, 98.0)]
)
def test_excels_values_come_out(folder, only_excel, cells, share):
    found = total(folder, only_excel)
    assert sum(found.counts.values()) > cells
    assert found.share >= share
    assert found.counts["silently different"] == 0
    # what changes with the day may differ; of the others nothing goes unsaid
    silent = {kind for kind in found.apart if kind.endswith("silently different")}
    assert silent <= {"volatile: silently different"}
