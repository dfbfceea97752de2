"""The known differences between xleq and Excel, by topic."""

from __future__ import annotations

from typing import Final

from tests.recalc.differences import Difference
from xleq.workbook import Calculation, ExternalBook

_MEMORY: Final = "Microsoft's description of the function (from memory)"
_MACHINE: Final = "the value belongs to the program and the machine, not to the file"
_NETWORK: Final = "xleq asks nothing outside the file"
_RARE: Final = "rare, and no stored values of Excel's were at hand to hold it against"

TOPICS: Final[dict[str, tuple[Difference, ...]]] = {
    "Numbers": (
        Difference(
            "=COS(PI()/2)", "6.1257422745431E-17", "6.12323399573677E-17",
            "neither is the 0 of mathematics, for no number of 15 digits is π/2; Excel's value is good "
            "to three digits, xleq's to all of them", stored=("COS.xlsx", "Sheet1", "B2"),
        ),
        Difference(
            "=SIN(PI())", "1.22514845490862E-16", "1.22464679914735E-16", "the same, at π",
            stored=("trigonometric_functions.xlsx", "Sheet1", "B12"),
        ),
        Difference(
            "=TAN(PI())", "-1.22514845490862E-16", "-1.22464679914735E-16", "the same",
            stored=("trigonometric_functions.xlsx", "Sheet1", "D12"),
        ),
        Difference(
            "=BESSELJ(0.2,0)", "0.990024974572687", "0.990024972239576",
            "Excel's approximation is good to about nine digits, to five at worst; where stored values "
            "are checked, Bessel functions may differ by 3E-5", stored=("BESSEL.xlsx", "BESSELJ", "B3"),
        ),
        Difference(
            "=BESSELK(0.2,0)", "1.75270384615397", "1.75270385552815", "the same",
            stored=("BESSEL.xlsx", "BESSELK", "B3"),
        ),
        Difference(
            "=XIRR({-20,5,5,5,5,5},{44958,44986,45017,45078,45108,45139})", "1.18591619729996",
            "1.18591620798211",
            "Excel stops iterating at an accuracy of 1E-8, xleq goes on to the last digits",
            stored=("XNPV.xlsx", "Sheet1", "R2"),
        ),
        Difference(
            "=ODDFYIELD(43891,47543,43845,44256,0.075,131.55696869340122,120,2,1)", "0.0499999999321231",
            "0.0499999999999998", "the same", stored=("PRICE_YIELD.xlsx", "ODDFPRICE_ODDFYIELD", "K8"),
        ),
        Difference(
            "=IRR({1,-2,1})", "1.09139951076642E-07", "2.8757006027541E-09",
            "a double root, 0: half of the digits are lost to any method",
            stored=("IRR.xlsx", "Three Parameters", "D2"),
        ),
        Difference(
            "=NPV(-0.14921894064178554,{2,3,-4})", "2.50549560763411E-14", "2.39808173319034E-14",
            "the sum is 0, what is left of it are rounding errors; the stored-value check reports such "
            "cells, for it compares numbers by their own size",
            stored=("IRR.xlsx", "Three Parameters", "E3"),
        ),
        Difference(
            "=1/3", "0.333333333333333 in its own last digits", "0.333333333333333",
            "a fresh number that agrees with the stored one to 1E-9 leaves the stored one in place, "
            "digit by digit", "Excel calculates the cell anew", before={"B1": 0.33333333333333337},
        ),
        Difference(
            "=A1", "0.33", "0.333333333333333",
            "\"precision as displayed\" is not applied: the file's cells hold all digits",
            'Microsoft, description of the setting "Set precision as displayed" (from memory)',
            cells={"A1": "=1/3"}, settings={"calculation": Calculation(full_precision=False)},
            situation='the workbook set to "precision as displayed" and A1 formatted 0.00',
        ),
    ),
    "Dates, texts and locale": (
        Difference(
            '=VALUE("10-12-1999")', "36504", "36445",
            "xleq reads and writes text as Excel does with US English settings, month before day; Excel "
            "takes the settings of the machine, which the file does not tell",
            stored=("T_VALUE_VALUETOTEXT.xlsx", "Sheet1", "I5"),
        ),
        Difference(
            '=VALUE("25/12/1999")', "36519 where the day comes first", "#VALUE!", "the same",
            "Microsoft's description of VALUE and DATEVALUE (from memory)",
        ),
        Difference(
            '="1,5"+1', "2.5 where the comma is the decimal mark", "#VALUE!", "the same",
            "Microsoft's description of VALUE (from memory)",
        ),
        Difference(
            '="ä"<"b"', "TRUE", "FALSE",
            "letters beyond ASCII sort after z, by their code; Excel sorts by the language of the machine",
            "Microsoft, sort order of Excel (from memory)",
        ),
        Difference(
            '=SORT({"ä";"a";"z"})', "a; ä; z", "a; z; ä", "the same",
            "Microsoft, sort order of Excel (from memory)",
        ),
        Difference(
            '=TEXT(43831,"[$-407]MMMM")', "Januar",
            "kept: the format shows months, days or eras in another language than English",
            "names of months and days are known in English only",
            "Microsoft's description of TEXT (from memory)",
        ),
        Difference(
            '=TEXT(43831,"[$-411]ge.m.d")', "R2.1.1",
            "kept: the format shows months, days or eras in another language than English",
            "the years of Japan's eras are not known",
            "Microsoft's description of number formats (from memory)",
        ),
        Difference(
            '=DATEDIF(DATE(2000,2,29),DATE(2002,3,8),"YD")', "7 or 8", "8",
            "Excel's versions differ; xleq counts in the year of the first date",
            "users' observations of several versions of Excel",
        ),
        Difference(
            r'=REGEXTEST("a","\p{L}")', "TRUE", "#VALUE!",
            "patterns are Python's, Excel's are those of PCRE2; classes by Unicode property are not "
            "among Python's", _MEMORY,
        ),
        Difference(
            '=REGEXTEST("aaaaaaaaaaaaaaaaaaaaaaaaaaaac","(a+)+b")', "FALSE",
            "kept: the regular expression could take too long on this text",
            "patterns whose time grows without bound are not tried", _MEMORY,
        ),
        Difference(
            "=BAHTTEXT(1234)", "the amount in Thai words", "kept: the function BAHTTEXT is not known",
            _RARE, _MEMORY,
        ),
        Difference(
            '=ASC("ＡＢ")', "AB", "kept: the function ASC is not known", "for double-byte languages", _MEMORY,
        ),
        Difference(
            '=DBCS("AB")', "AB, full width, in a double-byte language",
            "kept: the function DBCS is not known", "for double-byte languages", _MEMORY,
        ),
        Difference(
            "=PHONETIC(A1)", "the furigana of the cell", "kept: the function PHONETIC is not known",
            "for Japanese", _MEMORY,
        ),
    ),
    "What is outside the file": (
        Difference(
            '=WEBSERVICE("https://example.org")', "the answer of the server",
            "kept: WEBSERVICE is not computed: it would fetch something from the network", _NETWORK,
            _MEMORY,
        ),
        Difference(
            '=IMAGE("https://example.org/a.png")', "the picture",
            "kept: IMAGE is not computed: it would fetch something from the network", _NETWORK, _MEMORY,
        ),
        Difference(
            '=STOCKHISTORY("X",1)', "prices",
            "kept: STOCKHISTORY is not computed: it would fetch something from the network", _NETWORK,
            _MEMORY,
        ),
        Difference(
            '=RTD("server",,"topic")', "the server's value",
            "kept: RTD is not computed: it would run code outside the workbook", _NETWORK, _MEMORY,
        ),
        Difference(
            '=CUBEVALUE("model","[Measures].[Sum]")', "the cube's value",
            "kept: CUBEVALUE is not computed: it asks a data cube", _NETWORK, _MEMORY,
        ),
        Difference(
            '=GETPIVOTDATA("Sum of Score",A8,"Category","Category 1")', "3",
            "kept: GETPIVOTDATA is not computed: it asks a pivot table, which is not computed here",
            "pivot tables stay as they were", stored=("54436.xlsx", "Sheet1", "A14"),
        ),
        Difference(
            "=MyFunction(1)", "what the macro or add-in gives",
            "kept: the function MyFunction is not known",
            "macros are never run, other people's add-ins never loaded",
            "Excel runs them once the user allows it",
        ),
        Difference(
            "=[1]S!A1", "the present value, where the user lets the link be renewed", "12",
            "links are never followed; the value that the file remembers is used",
            "Excel asks whether to renew links",
            settings={"links": (ExternalBook(1, "other.xlsx", ("S",), {("S", 1, 1): 12.0}),)},
            situation="12 remembered in the file for the linked cell",
        ),
        Difference(
            '=CELL("width")', "10", 'kept: CELL("width") depends on the program that shows the workbook',
            _MACHINE, stored=("47804.xlsx", "Sheet1", "A2"),
        ),
        Difference(
            '=CELL("filename")', "path, file and sheet",
            'kept: CELL("filename") depends on the program that shows the workbook', _MACHINE, _MEMORY,
        ),
        Difference(
            '=CELL("protect")', "1 where the cell is locked",
            'kept: CELL("protect") depends on the program that shows the workbook', _RARE, _MEMORY,
        ),
        Difference(
            '=INFO("osversion")', "the system's name",
            'kept: INFO("osversion") depends on the program that shows the workbook', _MACHINE, _MEMORY,
        ),
        Difference(
            "=NOW()", "the time of the machine", "46085.5",
            "NOW and TODAY tell the time that the caller gives; by default that of the start", _MEMORY,
            situation="the time given as 4 March 2026, 12:00",
        ),
        Difference(
            "=RAND()", "another number at every calculation", "0.844421851525048",
            "random numbers repeat with their seed, 0 by default, so that two recalculations give one "
            "file", _MEMORY,
        ),
    ),
    "Functions that are not computed": (
        Difference(
            "=FORECAST.ETS(4,{1;2;3},{1;2;3})", "a forecast by exponential smoothing",
            "kept: the function FORECAST.ETS is not known", _RARE, _MEMORY,
        ),
        Difference(
            "=AMORLINC(2400,39679,39813,300,1,0.15,1)", "360", "kept: the function AMORLINC is not known",
            _RARE, _MEMORY,
        ),
        Difference(
            "=AMORDEGRC(2400,39679,39813,300,1,0.15,1)", "776", "kept: the function AMORDEGRC is not known",
            _RARE, _MEMORY,
        ),
        Difference(
            "=ODDLPRICE(43891,47543,43845,0.075,0.0589,120,2,2)", "122.367058394175",
            "kept: bonds with an odd last coupon on the bases 2 and 3",
            "Excel's stored values could not be reproduced on these bases; ODDLYIELD is the same",
            stored=("PRICE_YIELD.xlsx", "ODDLPRICE_ODDLYIELD", "I3"),
        ),
        Difference(
            "=DURATION(43282,54058,0.08,0.09,2,2)", "a duration in years",
            "kept: durations on the bases 2 and 3",
            "the rule for these bases is not certain; MDURATION is the same", _MEMORY,
        ),
        Difference(
            "=VDB(2400,300,10,0.5,2)", "a depreciation", "kept: VDB from within a period",
            "the rule for a begin within a period is not certain", _MEMORY,
        ),
        Difference(
            '=FILTERXML("<a>1</a>","//a")', "1", "kept: the function FILTERXML is not known", _RARE,
            _MEMORY,
        ),
        Difference(
            "=GROUPBY({1;1;2},{1;2;3},SUM)", "a table", "kept: the function GROUPBY is not known",
            "new; PIVOTBY is the same", _MEMORY,
        ),
        Difference(
            "=TRIMRANGE(A1:A9)", "the used part", "kept: the function TRIMRANGE is not known", "new",
            _MEMORY,
        ),
        Difference(
            '=EUROCONVERT(1,"DEM","EUR")', "0.51", "kept: the function EUROCONVERT is not known",
            "it belongs to an add-in", _MEMORY,
        ),
    ),
    "Workbooks": (
        Difference(
            "=_xlfn._xlws.FILTER({1;2},{0;0})", "#CALC!", "#VALUE!",
            "the newer errors, #SPILL! and #CALC! among them, need further parts in the file; xleq shows "
            "them itself and writes #VALUE!, which Excel replaces when it calculates",
            "files saved by Excel", situation="the recalculated file read again", written=True,
        ),
        Difference(
            "=A1*3", "6", "7 stays, 6 is reported",
            "a formula that does not reproduce its stored value from stored inputs keeps it; "
            "`--trust-fresh` writes the fresh one", "Excel calculates the cell anew", cells={"A1": 2.0},
            before={"B1": 7.0},
        ),
        Difference(
            "=A1+1", "what follows from the server's present answer", "kept: depends on S!A1",
            "what depends on a kept cell keeps its value too", "Excel calculates the cell anew",
            cells={'A1': '=WEBSERVICE("https://example.org")'}, before={"A1": 1.0, "B1": 2.0},
        ),
        Difference(
            "=B1+1", "0, with a warning", "kept: circular reference S!B1 → S!B1",
            "a circle without iteration has no value; with iteration set in the file it is iterated",
            "Microsoft, on circular references (from memory)", cells={"A1": 1.0},
        ),
        Difference(
            "=A1-(-4,3)", "0.2", "0.2 stays, #VALUE! is reported",
            "a union of constants, left over from a decimal comma; the file's own value is all that is "
            "known of it", cells={"A1": -4.1}, before={"B1": 0.2},
            stored=("clone_sheet.xlsx", "Arkusz1", "M6"),
        ),
    ),
}  # fmt: skip
