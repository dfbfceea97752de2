"""Text, date, lookup, logic and information functions against the examples of their published pages."""

import csv
from datetime import datetime
from decimal import Decimal
from pathlib import Path

import pytest

from xleq.cells import CellError
from xleq.recalc import evaluate_text

TABLE = Path(__file__).parents[1] / "reference" / "functions_of_text_dates_and_lookup.tsv"


def rows():
    with TABLE.open(encoding="utf-8", newline="") as file:
        lines = (line for line in file if not line.startswith("#"))
        yield from csv.DictReader(lines, delimiter="\t", quoting=csv.QUOTE_NONE)


def agrees(fresh, printed: str) -> bool:
    if printed.startswith("#"):
        return isinstance(fresh, CellError) and fresh.code == printed
    if printed.startswith('"'):
        return fresh == printed[1:-1].replace('""', '"')
    if printed in ("TRUE", "FALSE"):
        return fresh is (printed == "TRUE")
    half = float(Decimal(1).scaleb(Decimal(printed).as_tuple().exponent)) / 2
    return type(fresh) is float and abs(fresh - float(printed)) <= half


@pytest.mark.parametrize("row", list(rows()), ids=lambda row: row["formula"])
def test_the_example_on_the_page_of_the_function_has_its_value(row):
    fresh = evaluate_text(row["formula"], now=datetime(2026, 3, 5))
    assert agrees(fresh, row["value"]), f"{fresh!r}; source: Microsoft, {row['page']} function"


def test_every_row_is_read():
    assert len(list(rows())) == 214
