"""Make ``species.csv`` again from public tables: ``python -m xleq.thermo.make_species``.

Only this script needs the packages `chemicals` and `janaf` (of the test extra). What it takes:

- ``wanted.csv``: the species × phases, with CAS number and NIST-JANAF table;
- ``choices.csv``: numbers chosen by hand, where a table has none or another is better, with the reason;
- ``aqueous.csv``: ions and solutes that are not taken from the CRC table of aqueous ions as printed.

Heat capacities are brought to one form, Cp = A + B t + C t² + D t³ + E/t² with t = T/1000 K [J/(mol K)]
(Shomate's), by least squares where the source uses another; the worst deviation is kept in column `fit`.
Nothing is estimated: a substance that a table only estimates is left out.
"""

from __future__ import annotations

import csv
import json
import math
from collections.abc import Iterable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Final

from xleq.thermo.cp_fits import Piece, fit_function, fit_janaf, janaf_points

HERE: Final = Path(__file__).parent
_FORMATION: Final = "species,name,cas,also,dHf,S,T_min,T_max,A,B,C,D,E,dH_tr,fit,Tc,Pc,omega"
_ORIGIN: Final = "src_dHf,src_S,src_Cp,src_crit,janaf,note"
COLUMNS: Final = f"{_FORMATION},{_ORIGIN}".split(",")
CALORIE: Final = 4.184
T_ROOM: Final = 298.15
#: Lowest temperature to which a Cp given from 298 K upwards is continued; 25 K change H by a few J/mol.
T_COLD: Final = 273.15
#: Highest temperature of what is refitted [K]; in hotter flames only the small molecules are left.
T_HOT: Final = 3000.0
T_FLAME: Final = 4000.0
_SMALL: Final = "H2(g) O2(g) N2(g) CO(g) CO2(g) H2O(g) OH(g) H(g) O(g) N(g) NO(g) HCl(g) Cl(g)"
FLAME: Final = frozenset(_SMALL.split())
_GASES: Final = (
    "H2(g) O2(g) N2(g) Cl2(g) F2(g) Ar(g) He(g) Ne(g) Kr(g) Xe(g) Br2(l) Hg(l) I2(s) C(s) S(s) P(s)"
)
_METALS: Final = "Ca Mg Na K Fe Al Si Cu Zn Pb Ni Co Cr Mn Mo W Ag Sn Cd"
ELEMENTS: Final = frozenset([*_GASES.split(), *(f"{m}(s)" for m in _METALS.split())])
#: Melting, boiling or decomposition point at which a table that goes on is cut. [K]  NIST-JANAF.
T_END: Final = {
    "Br2(l)": 332.503, "Hg(l)": 629.839, "Ca(s)": 1115.0, "Fe(s)": 1809.0, "S(s)": 388.36, "P(s)": 317.3,
    "C(s)": 4000.0, "Na2SO4(s)": 1157.0, "K2SO4(s)": 1342.0, "S(l)": 882.117,
    "Ni(s)": 1728.0, "Li2CO3(s)": 993.15, "H3BO3(s)": 444.0, "FeS(s)": 1463.0, "Al2O3(s)": 2327.0,
    "PbO(s)": 762.0, "TiO2(s)": 2130.0, "Cr2O3(s)": 2603.0,
}  # fmt: skip

#: Melting point below which the table of an element is that of its solid. [K]  NIST-JANAF.
T_START: Final = {"Br2(l)": 265.9, "Hg(l)": 234.29}

HEADER: Final = (
    "# Species x phases, one line for each interval of Cp; made by make_species.py, not to be edited.",
    "# dHf [kJ/mol] and S [J/(mol K)] at 298.15 K and 1 bar (solutes: 1 mol/kg); T_min, T_max [K];",
    "# Cp = A + B x + C x^2 + D x^3 + E/x^2 [J/(mol K)] with x = T/1000 K; dH_tr [kJ/mol] on entering;",
    "# fit: worst relative deviation from the source; Tc [K], Pc [bar], omega; src_*: see sources.csv;",
    "# janaf: NIST-JANAF table to compare with, or the source of single values.",
    "# Numbers are facts; no table of another collection is reproduced.",
)

Rows = dict[str, dict[str, str]]


@dataclass(slots=True)
class Cp:
    """Heat capacity of a species and where it came from."""

    pieces: list[Piece]
    source: str
    note: str = ""


#: Where no source gives Cp: within 10 K of 298.15 K the error of leaving it out is below 0.03 in ln K.
UNKNOWN: Final = Cp([Piece(288.15, 308.15, (0.0,) * 5)], "", "Cp unknown: only within 10 K of 298.15 K")


@dataclass(slots=True)
class Tables:
    """The public tables, by CAS number."""

    crc: Rows
    atct: dict[str, Rows]
    webbook: Rows
    trc: Rows
    shomate: dict[str, list[list[list[float]] | None]]
    perry: dict[str, dict[str, dict[str, float | str | None]]]
    liquid: Rows
    critical: list[tuple[str, Rows]]
    ions: list[dict[str, str]] = field(default_factory=list)


def _tsv(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8") as file:
        return list(csv.DictReader(file, delimiter="\t"))


def _hyphens(cas: str) -> str:
    return f"{cas[:-3]}-{cas[-3:-1]}-{cas[-1]}" if len(cas) > 3 else cas


def read_tables() -> Tables:
    """Read the tables that the package `chemicals` carries (its estimates are not among them)."""
    import chemicals

    base = Path(chemicals.__file__).parent
    heat, reactions = base / "Heat Capacity", base / "Reactions"
    crc = _tsv(heat / "CRC Standard Thermodynamic Properties of Chemical Substances.tsv")
    trc = _tsv(heat / "TRC Thermodynamics of Organic Compounds in the Gas State.tsv")
    liquid = _tsv(heat / "Perry_Table_2-153_DIPPR_100.tsv")
    constants = _tsv(base / "Misc" / "heos_constants.tsv")
    psrk = _tsv(base / "Critical Properties" / "Appendix to PSRK Revision 4.tsv")
    return Tables(
        crc={r["CAS"]: r for r in crc},
        atct={p: {r["CAS"]: r for r in _tsv(reactions / f"ATcT 1.112 ({p}).tsv")} for p in "gl"},
        webbook={_hyphens(r["CAS"]): r for r in _tsv(base / "Misc" / "webbook_constants.tsv")},
        trc={r["CAS"]: r for r in trc},
        shomate=json.loads((heat / "webbook_shomate_coefficients.json").read_text("utf-8")),
        perry=json.loads((heat / "Perrys Table 2-151.json").read_text("utf-8")),
        liquid={r["CAS"]: r for r in liquid},
        critical=[("EOS", {r["CAS"]: r for r in constants}), ("PSRK", {r["CAS"]: r for r in psrk})],
        ions=_tsv(base / "Electrolytes" / "CRC Thermodynamic Properties of Aqueous Ions.tsv"),
    )


# --- heat capacities by source -------------------------------------------------------------------------


def _from_shomate(intervals: list[list[float]], table: str) -> list[Piece]:
    jumps = janaf_points(table)[1] if table else {}
    pieces: list[Piece] = []
    for t_min, t_max, *c in intervals:
        scaled = tuple(float(f"{v * s:.8g}") for v, s in zip(c, (1, 1e3, 1e6, 1e9, 1e-6), strict=True))
        near = [h for t, h in jumps.items() if abs(t - t_min) < 3.0]
        pieces.append(Piece(t_min, t_max, scaled, near[0] if near and pieces else 0.0))
    return pieces


def _from_trc(row: dict[str, str], t_hot: float) -> list[Piece]:
    from chemicals.heat_capacity import TRCCp

    a = [float(row[f"a{i}"] or 0.0) for i in range(8)]
    low, high = max(200.0, float(row["Tmin"])), min(t_hot, float(row["Tmax"]))
    return fit_function(lambda t: float(TRCCp(t, *a)), low, high)


def _from_perry(row: dict[str, float | str | None]) -> list[Piece]:
    a, b, c, d = (float(row[k] or 0.0) * CALORIE for k in ("Const", "Lin", "Quadinv", "Quad"))
    coefficients = tuple(float(f"{v:.8g}") for v in (a, b * 1e3, d * 1e6, 0.0, c * 1e-6))
    return [Piece(float(row["Tmin"] or 0), float(row["Tmax"] or 0), coefficients)]


def _from_dippr(row: dict[str, str]) -> list[Piece]:
    a = [float(row[k] or 0.0) / 1000.0 for k in "ABCDE"]
    return fit_function(
        lambda t: sum(v * t**i for i, v in enumerate(a)), float(row["Tmin"]), float(row["Tmax"]), 2e-3
    )


def _constant(value: float, t_max: float) -> list[Piece]:
    return [Piece(T_COLD, t_max, (value, 0.0, 0.0, 0.0, 0.0))]


def heat_capacity(row: dict[str, str], tables: Tables, chosen: dict[str, tuple[str, str, str]]) -> Cp:
    """Cp of a gas, solid or liquid: chosen by hand, else from the best table that reaches 298 K."""
    cas, phase, table = row["cas"], row["species"][-2], row["janaf"]
    if "Cp" in chosen:
        text, source, note = chosen["Cp"]
        low, high, *c = (float(x) for x in text.split(":"))
        return Cp([Piece(low, high, tuple(c))], source, note)
    places = tables.shomate.get(cas) or [None, None, None]
    intervals = places["slg".index(phase)]
    shomate = intervals if intervals and intervals[0][0] <= T_ROOM else None
    trc = tables.trc.get(cas) if phase == "g" else None
    if row["cp"] != "janaf":
        if trc and float(trc["Tmin"]) <= 200.0 and float(trc["Tmax"]) >= 1500.0:
            return Cp(_from_trc(trc, T_FLAME if row["species"] in FLAME else T_HOT), "TRC")
        if shomate and not (phase == "l" and cas in tables.liquid):
            return Cp(_from_shomate(shomate, table), "WB")
        if trc:
            return Cp(_from_trc(trc, T_FLAME if row["species"] in FLAME else T_HOT), "TRC")
        if phase == "l" and cas in tables.liquid:
            return Cp(_from_dippr(tables.liquid[cas]), "PERRY153")
    if table:
        start, end = T_START.get(row["species"], 200.0), T_END.get(row["species"], T_HOT)
        return Cp(fit_janaf(table, start, end), "JANAF")
    perry = tables.perry.get(cas, {}).get("c") if phase == "s" else None
    if (
        perry
        and perry["Tmin"]
        and perry["Tmax"]
        and float(perry["Tmin"]) <= T_ROOM < float(perry["Tmax"]) - 100
    ):
        return Cp(_from_perry(perry), "PERRY151")
    printed = tables.crc.get(cas, {}).get(f"Cp{phase}")
    if printed:
        return Cp(
            _constant(float(printed), 400.0 if phase == "s" else 350.0),
            "CRC",
            "Cp constant: known at 298.15 K only",
        )
    return UNKNOWN


# --- formation data ------------------------------------------------------------------------------------


def _janaf_room(table: str, column: str) -> float | None:
    import janaf

    for row in janaf.Table(index=table).df.iter_rows(named=True):
        if row["T(K)"] == T_ROOM and row[column] is not None:
            return float(row[column])
    return None


def formation(
    row: dict[str, str], tables: Tables, chosen: dict[str, tuple[str, str, str]]
) -> tuple[float, str, str]:
    """ΔfH°(298.15 K) [kJ/mol], its source, and a note where another source differs."""
    species, cas, phase = row["species"], row["cas"], row["species"][-2]
    if "dHf" in chosen:
        value, source, note = chosen["dHf"]
        return float(value), source, note
    if species in ELEMENTS:
        return 0.0, "DEF", ""
    found: list[tuple[float, str]] = []
    if (atct := tables.atct.get(phase, {}).get(cas)) and atct["Hfg" if phase == "g" else "Hfl"]:
        found.append((float(atct["Hfg" if phase == "g" else "Hfl"]) / 1000.0, "ATCT"))
    for source, data in (("CRC", tables.crc), ("WB", tables.webbook)):
        text = data.get(cas, {}).get(f"Hf{phase}")
        if text:
            found.append((round(float(text) / 1000.0, 3), source))
    if row["janaf"] and (h := _janaf_room(row["janaf"], "delta-f H")) is not None:
        found.append((h, "JANAF"))
    if phase == "l" and row["cp"] == "janaf" and found[-1][1] == "JANAF":
        found = [found[-1]]  # a melt: value, entropy and Cp of one table belong together
    return _first(found, 2.0, "kJ/mol")


def entropy(
    row: dict[str, str], tables: Tables, chosen: dict[str, tuple[str, str, str]]
) -> tuple[float, str, str]:
    """S°(298.15 K) [J/(mol K)], its source, and a note where another source differs."""
    cas, phase = row["cas"], row["species"][-2]
    if "S" in chosen:
        value, source, note = chosen["S"]
        return float(value), source, note
    found: list[tuple[float, str]] = []
    crc = tables.crc.get(cas, {}).get(f"S0{phase}")
    webbook = tables.webbook.get(cas, {}).get(f"S0{phase}")
    janaf = _janaf_room(row["janaf"], "S") if row["janaf"] else None
    if webbook and (not crc or abs(float(webbook) - float(crc)) < 0.5):
        found.append((round(float(webbook), 3), "WB"))
    if crc:
        found.append((float(crc), "CRC"))
    if webbook and not any(s == "WB" for _, s in found):
        found.append((round(float(webbook), 3), "WB"))
    if janaf is not None:
        found.append((janaf, "JANAF"))
    if phase == "g" and not found and (trc := tables.trc.get(cas)):
        from chemicals.heat_capacity import TRCCp_integral_over_T

        a = {f"a{i}": float(trc[f"a{i}"] or 0.0) for i in range(8)}
        found.append((round(float(TRCCp_integral_over_T(T_ROOM, **a, J=float(trc["J"]))), 2), "TRC"))
    if phase == "l" and row["cp"] == "janaf" and found and found[-1][1] == "JANAF":
        found = [found[-1]]
    return _first(found, 1.0, "J/(mol K)")


def _first(found: list[tuple[float, str]], limit: float, unit: str) -> tuple[float, str, str]:
    if not found:
        return math.nan, "", ""
    value, source = found[0]
    others = [f"{s} {v:g}" for v, s in found[1:] if abs(v - value) > limit]
    return value, source, f"elsewhere {' and '.join(others)} {unit}" if others else ""


def critical(cas: str, tables: Tables) -> tuple[str, str, str, str]:
    """Tc [K], Pc [bar], acentric factor and their source, or blanks."""
    for source, data in tables.critical:
        row = data.get(cas)
        if row and row["Tc"] and row["Pc"] and row["omega"]:
            return (
                f"{float(row['Tc']):g}",
                f"{float(row['Pc']) / 1e5:.6g}",
                f"{float(row['omega']):g}",
                source,
            )
    return "", "", "", ""


# --- assembly ------------------------------------------------------------------------------------------


def _read(name: str) -> list[dict[str, str]]:
    with (HERE / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def _lines(head: dict[str, str], cp: Cp) -> Iterable[dict[str, str]]:
    for i, piece in enumerate(cp.pieces):
        low = piece.t_min
        if i == 0 and (T_COLD < low < T_COLD + 0.1 or T_ROOM - 1.0 < low < T_ROOM + 0.1):
            low = T_COLD
        line = dict(head) if i == 0 else {"species": head["species"]}
        line |= {"T_min": f"{low:g}", "T_max": f"{piece.t_max:g}", "src_Cp": cp.source}
        if cp.source:
            line |= {k: f"{v:.8g}" for k, v in zip("ABCDE", piece.coefficients, strict=True)}
        line |= {
            "dH_tr": f"{piece.dh_tr:g}" if piece.dh_tr else "",
            "fit": f"{piece.fit:.1e}" if piece.fit else "",
        }
        yield line


def substances(tables: Tables) -> Iterable[dict[str, str]]:
    """Lines of the gases, solids and liquids."""
    chosen: dict[str, dict[str, tuple[str, str, str]]] = {}
    for r in _read("choices.csv"):
        chosen.setdefault(r["species"], {})[r["quantity"]] = (r["value"], r["source"], r["note"])
    missing: list[str] = []
    for row in _read("wanted.csv"):
        picks = chosen.get(row["species"], {})
        cp = heat_capacity(row, tables, picks)
        dhf, src_dhf, note_h = formation(row, tables, picks)
        s, src_s, note_s = entropy(row, tables, picks)
        if math.isnan(dhf) or math.isnan(s):
            missing.append(f"{row['species']}: dHf {dhf}, S {s}")
            continue
        head = {k: row[k] for k in ("species", "name", "cas", "also", "janaf")}
        notes = [f"dHf: {note_h}" if note_h else "", f"S: {note_s}" if note_s else "", cp.note]
        head |= {"dHf": f"{dhf:g}" if abs(dhf) < 1000 else f"{dhf:.8g}", "S": f"{s:.6g}"}
        head |= {"src_dHf": src_dhf, "src_S": src_s, "note": "; ".join(n for n in notes if n)}
        if row["species"].endswith("(g)"):
            head |= dict(zip(("Tc", "Pc", "omega", "src_crit"), critical(row["cas"], tables), strict=True))
        yield from _lines(head, cp)
    if missing:
        raise SystemExit("no source for\n" + "\n".join(missing))


def solutes(tables: Tables) -> Iterable[dict[str, str]]:
    """Lines of the aqueous ions and neutral solutes."""
    printed = {r["Formula"]: r for r in tables.ions}
    for row in _read("aqueous.csv"):
        ion = printed.get(row["crc"], {})
        head = {"species": row["species"], "name": row["name"], "cas": ion.get("CAS", "")}
        if row["dHf"]:
            head |= {k: row[k] for k in ("dHf", "S", "src_dHf", "src_S")}
        else:
            head |= {"dHf": f"{float(ion['Hf(aq)']) / 1000:g}", "S": ion["S(aq)"]}
            head |= {"src_dHf": "CRCAQ", "src_S": "CRCAQ"}
        value, source = (row["Cp"], row["src_Cp"]) if row["Cp"] else (ion.get("Cp(aq)", ""), "CRCAQ")
        cp = Cp(_constant(float(value), 348.15), source, "Cp constant") if value else UNKNOWN
        yield from _lines(head | {"note": cp.note}, cp)


def main() -> None:
    """Write ``species.csv`` beside this file."""
    tables = read_tables()
    with (HERE / "species.csv").open("w", encoding="utf-8", newline="") as file:
        file.write("\n".join(HEADER) + "\n")
        writer = csv.DictWriter(file, COLUMNS, lineterminator="\n", restval="")
        writer.writeheader()
        writer.writerows(substances(tables))
        writer.writerows(solutes(tables))


if __name__ == "__main__":
    main()
