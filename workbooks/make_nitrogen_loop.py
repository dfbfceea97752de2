"""Makes `nitrogen_loop.xlsx`: equilibrium at the outlet of an ammonia converter.

Run it with ``python workbooks/make_nitrogen_loop.py``.
"""

from __future__ import annotations

from pathlib import Path

import calculation_sheet as cs
from openpyxl import Workbook
from openpyxl.chart import Reference, ScatterChart, Series
from openpyxl.chart.shapes import GraphicalProperties
from openpyxl.drawing.line import LineProperties
from openpyxl.formatting.rule import ColorScaleRule, FormulaRule
from openpyxl.styles import Font, PatternFill
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

NUMBER = "HFW-C-2117"
FEED = (("N2", 5_820.0), ("H2", 17_300.0), ("NH3", 840.0), ("CH4", 1_950.0), ("Ar", 610.0))
# mol % NH3 from 3 H2 : 1 N2: Larson and Dodge, J. Am. Chem. Soc. 45 (1923) 2918 (from memory).
MEASURED = (
    (350, 10, 7.35),
    (400, 10, 3.85),
    (450, 10, 2.04),
    (500, 10, 1.20),
    (450, 30, 5.80),
    (450, 100, 16.36),
)


def log10_kp_half(kelvin: str) -> str:
    """Formula text of log10 Kp [atm^-1] of 1/2 N2 + 3/2 H2 = NH3 at a temperature in K.

    Gillespie and Beattie, Phys. Rev. 36 (1930) 743; the coefficients are from memory.
    """
    t = kelvin
    return f"-2.691122*LOG10({t})-0.00005519265*{t}+0.0000001848863*{t}^2+2001.6/{t}+2.6899"


def loop(book: Workbook) -> None:
    """Inputs, K on three bases, composition at the outlet, and what follows from it."""
    s = cs.new_sheet(book, "Loop", [42, 26, 16, 20, 20, 18, 30])
    row = cs.title_block(s, "Ammonia converter: equilibrium at the outlet", NUMBER, "B", 7)

    row = cs.heading(s, row, "1  Basis and assumptions", 7)
    for text in (
        "One reaction, N2 + 3 H2 = 2 NH3; methane and argon pass through.",
        "Ideal gas: above some tens of bar the real equilibrium holds more ammonia (sheet Checks).",
        "Pressures are gauge where the unit says so; xleq adds one standard atmosphere.",
    ):
        cs.label(s, row, text)
        row += 1

    row = cs.heading(s, row + 1, "2  Inputs", 7)
    row = cs.column_heads(s, row, ["Quantity", "Value", "Unit"])
    assert row == 15
    inputs = (
        ("Temperature at the outlet", 452.0, "degC", "0.0", "plant historian, mean of October (invented)"),
        ("Pressure at the outlet", 148.0, "barg", "0.0", "plant historian, mean of October (invented)"),
    )
    for text, value, unit, shape, source in inputs:
        cs.label(s, row, text)
        cs.entry(s, f"B{row}", value, shape)
        cs.entry(s, f"C{row}", unit)
        cs.note(s, row, 4, source)
        row += 1
    units = DataValidation(type="list", formula1='"degC,K,degF"', allow_blank=False)
    pressures = DataValidation(type="list", formula1='"barg,bar,atm,kPa,psig,psia"', allow_blank=False)
    units.add("C15")
    pressures.add("C16")
    s.add_data_validation(units)
    s.add_data_validation(pressures)
    cs.remark(s, "C16", "Gauge and absolute units are told apart by their names: barg, psig, kPag are gauge.")

    row = cs.heading(s, row + 1, "3  Equilibrium constant at the outlet temperature", 7)
    assert row == 19
    cs.label(s, 19, "Reaction of the correlation")
    cs.step(s, "B19", "1/2 N2 + 3/2 H2 = NH3")
    cs.label(s, 20, "Reaction of this sheet")
    cs.step(s, "B20", "=XLEQ_COMBINE(B19,2)")
    cs.label(s, 21, "Temperature, K")
    cs.step(s, "B21", '=CONVERT(B15,IF(C15="degC","C",IF(C15="degF","F","K")),"K")', "0.00")
    cs.label(s, 22, "log10 Kp of the half reaction, atm^-1")
    cs.step(s, "B22", f"={log10_kp_half('B21')}", "0.0000")
    cs.note(s, 22, 4, "Gillespie and Beattie, Phys. Rev. 36 (1930) 743; coefficients from memory")
    cs.label(s, 23, "Kp of the half reaction, atm^-1")
    cs.step(s, "B23", "=10^B22", "0.000E+00")
    cs.label(s, 24, "Kp of the reaction of this sheet, atm^-2")
    cs.step(s, "B24", "=XLEQ_K_SCALE(B23,2)", "0.000E+00")
    cs.note(s, 24, 4, "the half reaction's K squared; left unsquared it is a classic mistake")
    cs.label(s, 25, "K on p° = 1 bar")
    cs.result(s, "B25", '=XLEQ_K_CONVERT(B24,B20,"Kp[atm]","K")', "0.000E+00")
    cs.label(s, 26, "Kc, (mol/L)^-2")
    cs.step(s, "B26", '=XLEQ_K_CONVERT(B25,B20,"K","Kc[mol/L]",B21)', "0.0000")
    cs.label(s, 27, "Expression")
    cs.step(s, "B27", "=XLEQ_EXPRESSION(B20)")

    row = cs.heading(s, 29, "4  Composition", 7)
    row = cs.column_heads(
        s, row,
        [
            "Species", "Feed, kmol/h", "Feed, mol %",
            "Equilibrium, kmol/h", "Equilibrium, mol %", "Change, kmol/h",
        ],
    )  # fmt: skip
    assert row == 31
    last = row + len(FEED) - 1
    call = f"=XLEQ_COMPOSITION_P($B$20,$B$25,$A$31:$A${last},$B$31:$B${last},$B$15&$C$15,$B$16&$C$16"
    for i, (name, feed) in enumerate(FEED):
        at = row + i
        cs.label(s, at, name)
        cs.entry(s, f"B{at}", feed, "#,##0")
        cs.step(s, f"C{at}", f"=B{at}/SUM(B$31:B${last})", "0.00%")
        cs.result(s, f"D{at}", f'{call},"moles "&$A{at})', "#,##0.0")
        cs.result(s, f"E{at}", f'{call},"fractions "&$A{at})', "0.00%")
        cs.step(s, f"F{at}", f"=D{at}-B{at}", "#,##0.0")
    cs.label(s, last + 1, "Total")
    for column, shape in (("B", "#,##0"), ("C", "0.00%"), ("D", "#,##0.0"), ("E", "0.00%"), ("F", "#,##0.0")):
        cs.step(s, f"{column}{last + 1}", f"=SUM({column}{row}:{column}{last})", shape)

    row = cs.heading(s, last + 3, "5  Results", 7)
    assert row == 39
    cs.label(s, 39, "Ammonia at equilibrium, mol %")
    cs.result(s, "B39", "=E33", "0.00%")
    cs.label(s, 40, "Conversion of nitrogen per pass")
    cs.result(s, "B40", f'{call},"conversion N2")', "0.00%")
    cs.label(s, 41, "Ammonia made, t/d")
    cs.result(s, "B41", '=F33*XLEQ_MOLAR_MASS("NH3")*24/1000', "#,##0")
    cs.label(s, 42, "Ammonia measured at the outlet, mol %")
    cs.entry(s, "B42", 0.158, "0.00%")
    cs.note(s, 42, 4, "laboratory, 2026-10-28 (invented)")
    cs.label(s, 43, "Share of the equilibrium ammonia reached")
    cs.result(s, "B43", "=B42/B39", "0.0%")
    cs.label(s, 44, "State of the calculation")
    cs.step(s, "B44", f'{call},"state")')

    row = cs.heading(s, 46, "6  Checks", 7)
    balances = (
        (
            "Nitrogen atoms in minus out, kmol/h",
            "=2*(D31-B31)+(D33-B33)",
            "0.0E+00",
            '=IF(ABS(B47)<0.000001*B36,"ok","look")',
        ),
        (
            "Hydrogen atoms in minus out, kmol/h",
            "=2*(D32-B32)+3*(D33-B33)",
            "0.0E+00",
            '=IF(ABS(B48)<0.000001*B36,"ok","look")',
        ),
        ("Fractions sum to one", "=E36", "0.0000%", '=IF(ABS(B49-1)<0.000000001,"ok","look")'),
        (
            "Quotient over K at the computed composition",
            f"=XLEQ_Q(B20,A31:A{last},D31:D{last},B16&C16,B15&C15)/B25",
            "0.000000",
            '=IF(ABS(B50-1)<0.000001,"ok","look")',
        ),
    )
    for at, (text, formula, shape, verdict) in enumerate(balances, row):
        cs.label(s, at, text)
        cs.step(s, f"B{at}", formula, shape)
        cs.step(s, f"C{at}", verdict)
    look = FormulaRule(
        formula=['$C47="look"'], fill=PatternFill("solid", bgColor="F4C7C3"), font=Font(bold=True)
    )
    s.conditional_formatting.add("C47:C50", look)
    s.print_area = "A1:G50"
    s.freeze_panes = "A3"
    for name, address in (("T_outlet", "$B$21"), ("K_outlet", "$B$25"), ("Reaction", "$B$20")):
        book.defined_names[name] = DefinedName(name, attr_text=f"Loop!{address}")


def temperature_pressure_map(book: Workbook) -> None:
    """Equilibrium ammonia over temperature and pressure for the feed of the loop, and its chart."""
    s = cs.new_sheet(book, "Map", [16, 14, *[11] * 8])
    cs.title_block(s, "Equilibrium ammonia over temperature and pressure", NUMBER, "B", 10)
    cs.label(
        s,
        8,
        "Mole fraction of ammonia at equilibrium, feed of the sheet Loop, ideal gas; pressures are absolute.",
    )
    cs.column_heads(s, 10, ["Temperature, degC", "K (1 bar)"])
    pressures = (50, 100, 150, 200, 250, 300)
    for column, pressure in enumerate(pressures, 3):
        cell = s.cell(10, column, pressure)
        cell.number_format = '0 "bar"'
        cell.font = Font(name="Calibri", size=10, bold=True)
        cell.fill = PatternFill("solid", fgColor=cs.PALE)
    for row, celsius in enumerate(range(340, 541, 20), 11):
        cs.entry(s, f"A{row}", float(celsius), "0")
        kelvin = f"($A{row}+273.15)"
        cs.step(
            s, f"B{row}",
            f"=XLEQ_K_CONVERT((10^({log10_kp_half(kelvin)}))^2,Reaction,\"Kp[atm]\",\"K\")",
            "0.00E+00",
        )  # fmt: skip
        for column in range(3, 3 + len(pressures)):
            letter = chr(64 + column)
            cs.step(
                s, f"{letter}{row}",
                f"=XLEQ_COMPOSITION_P(Reaction,$B{row},Loop!$A$31:$A$35,Loop!$B$31:$B$35,"
                f'$A{row}&" degC",{letter}$10,"fractions NH3")',
                "0.0%",
            )  # fmt: skip
    s.conditional_formatting.add(
        "C11:H21", ColorScaleRule(start_type="min", start_color="FFFFFF", end_type="max", end_color="9CC9C0")
    )
    s.add_chart(_map_chart(s), "A24")
    s.print_area = "A1:J50"


def _map_chart(s: Worksheet) -> ScatterChart:
    chart = ScatterChart()
    chart.title = "Ammonia at equilibrium"
    chart.style = 2
    chart.x_axis.title = "Temperature, degC"
    chart.y_axis.title = "Mole fraction NH3"
    chart.x_axis.scaling.min, chart.x_axis.scaling.max = 340, 540
    chart.y_axis.scaling.min = 0
    chart.x_axis.majorUnit = 20
    chart.x_axis.number_format, chart.y_axis.number_format = "0", "0%"
    chart.x_axis.delete = chart.y_axis.delete = False
    chart.y_axis.majorGridlines.spPr = GraphicalProperties(ln=LineProperties(solidFill="D3DDDF"))
    chart.x_axis.majorGridlines = None
    chart.width, chart.height = 24, 12
    chart.legend.position = "r"
    colours = ("B7D3D6", "86B5BA", "57979F", "2E7984", "1F5C66", "123F47")
    for column, colour in enumerate(colours, 3):
        series = Series(
            Reference(s, min_col=column, min_row=11, max_row=21),
            Reference(s, min_col=1, min_row=11, max_row=21),
            title=f"{s.cell(10, column).value} bar",
        )
        series.marker.symbol = "none"
        series.graphicalProperties.line.solidFill = colour
        series.graphicalProperties.line.width = 22_000
        series.smooth = False
        chart.series.append(series)
    return chart


def checks(book: Workbook) -> None:
    """The ideal-gas calculation beside published measurements."""
    s = cs.new_sheet(book, "Checks", [20, 16, 18, 18, 18, 40])
    cs.title_block(s, "Beside published measurements", NUMBER, "B", 6)
    cs.label(
        s,
        8,
        "3 H2 : 1 N2 at equilibrium; measured: Larson and Dodge, JACS 45 (1923) 2918 (from memory).",
    )
    cs.column_heads(
        s, 10,
        [
            "Temperature, degC", "Pressure, atm",
            "Measured, mol % NH3", "Ideal gas, mol % NH3", "Ideal over measured",
        ],
    )  # fmt: skip
    for row, (celsius, atmospheres, percent) in enumerate(MEASURED, 11):
        cs.entry(s, f"A{row}", float(celsius), "0")
        cs.entry(s, f"B{row}", float(atmospheres), "0")
        cs.entry(s, f"C{row}", percent, "0.00")
        cs.step(
            s, f"D{row}",
            f'=100*XLEQ_COMPOSITION_P("1/2 N2 + 3/2 H2 = NH3",10^({log10_kp_half(f"(A{row}+273.15)")}),'
            f'"N2; H2; NH3","1; 3; 0",A{row}&" degC",B{row}&" atm","fractions NH3","basis=Kp[atm]")',
            "0.00",
        )  # fmt: skip
        cs.step(s, f"E{row}", f"=D{row}/C{row}-1", "+0.0%;-0.0%")
    cs.label(s, 18, "Largest departure at 10 atm")
    cs.result(s, "D18", "=MAX(MAX(E11:E14),-MIN(E11:E14))", "0.0%")
    cs.label(s, 19, "At 100 atm the ideal gas falls short: a real-gas calculation is needed there.")
    cs.label(s, 21, "Program")
    cs.step(s, "B21", "=XLEQ_VERSION()")
    s.print_area = "A1:F21"


def main() -> None:
    """Make the workbook beside this script."""
    book = Workbook()
    loop(book)
    temperature_pressure_map(book)
    checks(book)
    cs.save(book, Path(__file__).with_name("nitrogen_loop.xlsx"))


if __name__ == "__main__":
    main()
