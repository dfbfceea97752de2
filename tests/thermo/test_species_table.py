"""The table of species: pinned, sourced, consistent with itself, and made again by its script."""

import csv
import math
from pathlib import Path

import pytest

from xleq.reactions import parse_species
from xleq.thermo import citations, standard_table

FOLDER = Path(__file__).parents[2] / "xleq" / "thermo"


def lines() -> list[dict[str, str]]:
    with (FOLDER / "species.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


HEADS = [line for line in lines() if line["src_dHf"]]
TABLE = standard_table()
#: Pins of the data file, to be changed only together with it.
N_SPECIES, N_LINES = 405, 625
SUM_DHF, SUM_S, SUM_CP = 152258.203, 55916.059, 20156.047185549403


def test_the_table_is_unchanged():
    assert (len(HEADS), len(lines())) == (N_SPECIES, N_LINES)
    assert len(TABLE) == N_SPECIES
    assert math.fsum(abs(d.dhf) for d in TABLE.data.values()) == pytest.approx(SUM_DHF, rel=1e-12)
    assert math.fsum(d.s298 for d in TABLE.data.values()) == pytest.approx(SUM_S, rel=1e-12)
    assert math.fsum(d.cp(298.15) for d in TABLE.data.values() if d.cp_known) == pytest.approx(
        SUM_CP, rel=1e-9
    )


def test_every_number_has_a_source_that_is_cited():
    cited = citations()
    for line in lines():
        if line["src_dHf"]:
            assert {line["src_dHf"], line["src_S"]} <= set(cited), line["species"]
        if line["A"]:
            assert line["src_Cp"] in cited, line["species"]
        else:
            assert "Cp unknown" in line["note"], line["species"]
        assert bool(line["Tc"]) == bool(line["Pc"]) == bool(line["omega"]) == bool(line["src_crit"])
        assert not line["src_crit"] or line["src_crit"] in cited


def test_no_source_is_cited_in_vain():
    used = {line[c] for line in lines() for c in ("src_dHf", "src_S", "src_Cp", "src_crit")}
    assert set(citations()) == used - {""}


def test_every_species_reads_as_a_formula_and_stands_once():
    assert len({d.key for d in TABLE.data.values()}) == len(HEADS)
    for line in HEADS:
        species = parse_species(line["species"])
        assert species.phase in ("g", "l", "s", "aq")
        assert species.formula is not None or line["species"].startswith("{"), line["species"]
        assert TABLE.find(line["species"]).key == species.key


def test_elements_in_their_reference_state_have_no_enthalpy_of_formation():
    for text in (
        "H2",
        "O2",
        "N2",
        "Cl2",
        "F2",
        "Ar",
        "C(s)",
        "S(s)",
        "Fe(s)",
        "Br2(l)",
        "Hg(l)",
        "I2(s)",
        "P(s)",
    ):
        assert TABLE.find(text).dhf == 0.0, text


@pytest.mark.parametrize("data", TABLE.data.values(), ids=lambda d: d.key)
def test_intervals_join_and_h_and_s_pass_through_the_formation_data(data):
    assert data.h(298.15, extrapolate=True) == pytest.approx(data.dhf, abs=1e-9)
    assert data.s(298.15, extrapolate=True) == pytest.approx(data.s298, abs=1e-9)
    assert data.t_min < 298.15 < data.t_max
    for below, above, part in zip(data.intervals, data.intervals[1:], data.parts[1:], strict=False):
        t = above.t_min
        assert below.t_max == t
        assert above.h(t) - below.h(t) == pytest.approx(part.dh_tr, abs=1e-9)
        assert above.s(t) - below.s(t) == pytest.approx(part.dh_tr * 1000 / t, abs=1e-9)


@pytest.mark.parametrize("data", TABLE.data.values(), ids=lambda d: d.key)
def test_h_and_s_are_the_integrals_of_cp(data):
    step = 0.01
    t = data.t_min + 1.0
    while t < data.t_max - 1.0:
        near_break = any(abs(t - i.t_min) < 1.0 for i in data.intervals[1:])
        if data.cp_known and not near_break:
            cp = data.cp(t)
            assert (data.h(t + step) - data.h(t - step)) / (2 * step) * 1000 == pytest.approx(
                cp, rel=1e-5, abs=1e-4
            )
            assert (data.s(t + step) - data.s(t - step)) / (2 * step) * t == pytest.approx(
                cp, rel=1e-5, abs=1e-4
            )
            assert cp > 0 or data.key.endswith("(aq)")
        t += (data.t_max - data.t_min) / 7


#: Magnetic and λ peaks, where Cp itself is not followed but the enthalpy across them is kept.
PEAKS = {"Fe(s)", "Ni(s)", "S(l)", "Cr2O3(s)", "Li2CO3(s)"}


def test_refitted_heat_capacities_follow_their_source():
    for line in lines():
        if line["fit"] and line["species"] not in PEAKS:
            limit = 0.002 if line["src_Cp"] in ("TRC", "PERRY153") else 0.012
            assert float(line["fit"]) <= limit, (line["species"], line["T_min"], line["fit"])


@pytest.mark.slow
def test_the_script_makes_the_table_again():
    from xleq.thermo.make_species import read_tables, solutes, substances

    tables = read_tables()
    made = [*substances(tables), *solutes(tables)]
    stored = lines()
    assert len(made) == len(stored)
    for new, old in zip(made, stored, strict=True):
        for column, text in old.items():
            fresh = new.get(column, "")
            if column in "ABCDE" and text:
                assert float(fresh) == pytest.approx(float(text), rel=1e-4, abs=1e-4), (
                    old["species"],
                    column,
                )
            else:
                assert fresh == text, (old["species"], column)
