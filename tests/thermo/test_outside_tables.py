"""Every species beside the outside tables that cover it: `chemicals` (ATcT, CRC, WebBook, TRC) and `janaf`.

Tolerances: ΔfH° 2 kJ/mol or 0.3 % and S° 1 J/(mol K) or 1 % against the nearest table other than the one the
number was taken from; Cp, H and S over temperature as their effect on ln K, up to 2000 K, 0.02 (refitted or
Shomate values of one work differ by less, two works by as much). What lies outside stands, with its reason,
in ``outside_disagreements.tsv`` beside this file; a line there that is no longer needed fails.
"""

import csv
from functools import lru_cache
from pathlib import Path

import pytest

from xleq.thermo import SpeciesData, standard_table
from xleq.thermo.make_species import Tables, read_tables

HERE = Path(__file__).parent
SPECIES_CSV = HERE.parents[1] / "xleq" / "thermo" / "species.csv"
GAS_CONSTANT_JANAF = 8.31451
T_COMPARED = 2000.0
LN_K = 0.02
#: Species that an outside table covers, of all.
N_COVERED = 378

with SPECIES_CSV.open(encoding="utf-8", newline="") as _file:
    _lines = csv.DictReader(line for line in _file if not line.startswith("#"))
    HEADS = [line for line in _lines if line["src_dHf"]]
with (HERE / "outside_disagreements.tsv").open(encoding="utf-8") as _file:
    KNOWN = {(r["species"], r["what"]): r["reason"] for r in csv.DictReader(_file, delimiter="\t")}


TABLES: Tables = read_tables()


def data_of(line: dict[str, str]) -> SpeciesData:
    return standard_table().find(line["species"])


@lru_cache(maxsize=512)
def janaf_rows(table: str) -> list[dict[str, float]]:
    import janaf

    rows = janaf.Table(index=table).df.iter_rows(named=True)
    return [
        {"t": r["T(K)"], "cp": r["Cp"], "s": r["S"], "h": r["H-H(Tr)"], "hf": r["delta-f H"]}
        for r in rows
        if r["Cp"] is not None and r["S"] is not None and r["H-H(Tr)"] is not None and not r["Note"]
    ]


def outside(line: dict[str, str], quantity: str) -> dict[str, float]:
    """ΔfH° [kJ/mol] or S° [J/(mol K)] of a species by each outside table that has it."""
    cas, phase = line["cas"], line["species"][-2]
    if phase == "q":
        ions = {r["CAS"]: r for r in TABLES.ions}
        text = ions.get(cas, {}).get("Hf(aq)" if quantity == "dHf" else "S(aq)") if cas else ""
        return {"CRCAQ": float(text) / (1000 if quantity == "dHf" else 1)} if text else {}
    found: dict[str, float] = {}
    column, scale = (f"Hf{phase}", 1000.0) if quantity == "dHf" else (f"S0{phase}", 1.0)
    for name, rows in (("CRC", TABLES.crc), ("WB", TABLES.webbook)):
        text = rows.get(cas, {}).get(column)
        if text:
            found[name] = float(text) / scale
    if quantity == "dHf" and phase in "gl":
        text = TABLES.atct[phase].get(cas, {}).get(column)
        if text:
            found["ATCT"] = float(text) / scale
    for row in janaf_rows(line["janaf"]) if line["janaf"] else []:
        if row["t"] == 298.15:
            value = row["hf"] if quantity == "dHf" else row["s"]
            if value is not None:
                found["JANAF"] = float(value)
    return found


def judge(line: dict[str, str], what: str, deviation: float, limit: float, text: str) -> None:
    listed = (line["species"], what) in KNOWN
    if deviation > limit:
        assert listed, f"{line['species']} {what}: {text}; deviation {deviation:.4g} > {limit:.4g}"
        pytest.xfail(KNOWN[line["species"], what])
    assert not listed, f"{line['species']} {what} is listed as a disagreement, but agrees: {text}"


def others(line: dict[str, str], quantity: str) -> tuple[float, str, dict[str, float]]:
    """Our value, its source, and the outside tables that have it, the source itself checked and left out."""
    data = data_of(line)
    value, source = (data.dhf, data.sources.dhf) if quantity == "dHf" else (data.s298, data.sources.s)
    return value, source, outside(line, quantity)


TWICE = [
    (line, quantity)
    for line in HEADS
    for quantity in ("dHf", "S")
    if set(outside(line, quantity)) - {others(line, quantity)[1]}
]


@pytest.mark.parametrize(("line", "quantity"), TWICE, ids=lambda x: x if isinstance(x, str) else x["species"])
def test_formation_data_agree_with_a_table_other_than_their_own(line, quantity):
    value, source, found = others(line, quantity)
    found.pop(source, None)
    nearest = min(found, key=lambda k: abs(found[k] - value))
    limit = max(2.0, 0.003 * abs(value)) if quantity == "dHf" else max(1.0, 0.01 * abs(value))
    text = f"{value:g} ({source}); " + ", ".join(f"{k} {v:g}" for k, v in found.items())
    judge(line, quantity, abs(found[nearest] - value), limit, text)


def test_formation_data_are_as_their_source_prints_them():
    checked = 0
    for line in HEADS:
        for quantity in ("dHf", "S"):
            value, source, found = others(line, quantity)
            if source in found:
                assert value == pytest.approx(found[source], abs=6e-4), (line["species"], quantity, source)
                checked += 1
    assert checked > 600


@pytest.mark.parametrize("line", [x for x in HEADS if x["janaf"]], ids=lambda x: x["species"])
def test_heat_content_agrees_with_nist_janaf(line):
    data = data_of(line)
    rows = [r for r in janaf_rows(line["janaf"]) if data.t_min <= r["t"] <= min(data.t_max, T_COMPARED)]
    room = [r for r in rows if r["t"] == 298.15]
    worst, at = 0.0, 0.0
    for r in rows:
        dh = (data.h(r["t"]) - data.dhf) - r["h"]
        ds = (data.s(r["t"]) - data.s298) - (r["s"] - room[0]["s"])
        effect = abs(dh * 1000 / r["t"] - ds) / GAS_CONSTANT_JANAF
        if effect > worst:
            worst, at = effect, r["t"]
    judge(
        line, "Cp", worst, LN_K, f"Gibbs function off by {worst:.4f} in ln K at {at:g} K ({line['src_Cp']})"
    )


PRINTED_CP = [
    line
    for line in HEADS
    if line["src_Cp"] not in ("", "CRC", "CRCAQ", "SH88", "DEF")
    and TABLES.crc.get(line["cas"], {}).get(f"Cp{line['species'][-2]}")
]


@pytest.mark.parametrize("line", PRINTED_CP, ids=lambda x: x["species"])
def test_cp_at_room_temperature_agrees_with_crc(line):
    text = TABLES.crc[line["cas"]][f"Cp{line['species'][-2]}"]
    cp = data_of(line).cp(298.15)
    judge(line, "Cp298", abs(cp / float(text) - 1), 0.03, f"{cp:.4g} ({line['src_Cp']}), CRC {text}")


def test_most_species_are_covered_by_an_outside_table():
    assert sum(bool(outside(line, "dHf")) for line in HEADS) == N_COVERED


def test_every_listed_disagreement_is_one_that_was_looked_at():
    looked_at = {(line["species"], quantity) for line, quantity in TWICE}
    looked_at |= {(line["species"], "Cp298") for line in PRINTED_CP}
    looked_at |= {(line["species"], "Cp") for line in HEADS if line["janaf"]}
    assert set(KNOWN) <= looked_at
