"""The commands and their options. Everything they need is imported when they run, so that help is at once."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

app = typer.Typer(
    name="xleq",
    help="Chemical-equilibrium worksheet functions: one formula, whole workbooks, and their checks.",
    epilog="An equilibrium figure is a limit, not a rate or a design; have it checked by a qualified person.",
    add_completion=False,
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)

Books = Annotated[list[Path], typer.Argument(help="Workbooks (.xlsx, .xlsm).", show_default=False)]
Json = Annotated[bool, typer.Option("--json", help="Print one JSON object a workbook instead.")]
Set = Annotated[
    list[str] | None,
    typer.Option(
        "--set", metavar="ADDRESS=VALUE", help="Put a value into an input cell or a defined name first."
    ),
]
Trust = Annotated[
    bool,
    typer.Option(
        "--trust-fresh", help="Write fresh values even where a stored value could not be reproduced."
    ),
]
Limit = Annotated[
    list[str] | None,
    typer.Option(
        "--limit",
        metavar="NAME=VALUE",
        help="Set a limit against hostile files: file_size, entries, total_size, ratio, ratio_from, "
        "xml_depth, cells, formula_length, or seconds that a recalculation may take.",
    ),
]


@app.command("eval")
def evaluate(
    formula: Annotated[str, typer.Argument(help="A formula, with or without the equals sign.")],
    json: Json = False,
) -> None:
    """Evaluate one formula: its value, or its error and the reason."""
    from xleq.cli.evaluate import run

    raise typer.Exit(run(formula, as_json=json))


@app.command()
def recalc(
    books: Books,
    out: Annotated[
        Path | None, typer.Option("--out", "-o", metavar="FILE", help="Where the recalculated copy goes.")
    ] = None,
    in_place: Annotated[
        bool,
        typer.Option("--in-place", help="Replace the workbook; a backup of the old one stays beside it."),
    ] = False,
    set_: Set = None,
    trust_fresh: Trust = False,
    limit: Limit = None,
    json: Json = False,
) -> None:
    """Recalculate workbooks and write the fresh values; all else in the file stays as it is."""
    from xleq.cli.recalculate import run

    code = run(
        books,
        out=out,
        in_place=in_place,
        settings=set_ or [],
        trust_fresh=trust_fresh,
        limits=limit or [],
        as_json=json,
    )
    raise typer.Exit(code)


@app.command()
def check(books: Books, limit: Limit = None, json: Json = False) -> None:
    """Recalculate without writing; fail where stored and fresh values differ."""
    from xleq.cli.recalculate import run_check

    raise typer.Exit(run_check(books, limits=limit or [], as_json=json))


@app.command()
def functions(
    name: Annotated[str | None, typer.Argument(help="A function's name.", show_default=False)] = None,
    json: Json = False,
) -> None:
    """List the worksheet functions, or show one with arguments, units, source and examples."""
    from xleq.cli.functions import run

    raise typer.Exit(run(name, as_json=json))


calc = typer.Typer(help="The live functions in LibreOffice Calc.", no_args_is_help=True)
excel = typer.Typer(help="The live functions in Excel for Windows.", no_args_is_help=True)
app.add_typer(calc, name="calc")
app.add_typer(excel, name="excel")

Office = Annotated[
    Path | None,
    typer.Option("--office", metavar="SOFFICE", help="LibreOffice's soffice, where it is not found alone."),
]


@calc.command("install")
def calc_install(office: Office = None) -> None:
    """Build the add-in from the function table and put it into LibreOffice."""
    from xleq.cli.calc import run_install

    raise typer.Exit(run_install(office))


@calc.command("remove")
def calc_remove(office: Office = None) -> None:
    """Take the add-in out of LibreOffice."""
    from xleq.cli.calc import run_remove

    raise typer.Exit(run_remove(office))


@calc.command("status")
def calc_status(office: Office = None) -> None:
    """Show which LibreOffice there is, whether the add-in fits it, and whether it is installed."""
    from xleq.cli.calc import run_status

    raise typer.Exit(run_status(office))


@excel.command("install")
def excel_install() -> None:
    """Build the add-in from the function table and put it into Excel."""
    from xleq.cli.excel import run_install

    raise typer.Exit(run_install())


@excel.command("remove")
def excel_remove() -> None:
    """Take the add-in out of Excel."""
    from xleq.cli.excel import run_remove

    raise typer.Exit(run_remove())


@excel.command("status")
def excel_status() -> None:
    """Show which Excel there is and whether the add-in is installed."""
    from xleq.cli.excel import run_status

    raise typer.Exit(run_status())


@excel.command("vba")
def excel_vba() -> None:
    """Print the functions as VBA, to be pasted into a workbook."""
    from xleq.cli.excel import run_vba

    raise typer.Exit(run_vba())


@excel.command("smoke")
def excel_smoke(
    books: Books,
    out: Annotated[Path, typer.Option("--out", "-o", metavar="FILE", help="Where the report goes.")] = Path(
        "excel_report.txt"
    ),
) -> None:
    """Recalculate workbooks in Excel and compare every cell with the headless values."""
    from xleq.cli.excel import run_smoke

    raise typer.Exit(run_smoke(books, out))


def _version(wanted: bool) -> None:
    if wanted:
        from xleq import __version__

        print(f"xleq {__version__}")
        raise typer.Exit


@app.callback()
def _options(
    version: Annotated[
        bool, typer.Option("--version", help="Show the version and exit.", callback=_version, is_eager=True)
    ] = False,
) -> None:
    pass
