"""The command line: demo, recalc, functions, add-ins. Everything heavy is loaded by the command that needs it."""

from __future__ import annotations

import sys
from enum import Enum
from pathlib import Path
from typing import Annotated, Optional

import typer

from .version import __version__

app = typer.Typer(
    name="uffuncs",
    help="Ultrafiltration engineering functions for worksheets.",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)

CLEAN, ERROR_CELLS, UNREADABLE = 0, 1, 2


def main() -> None:
    """Entry point: an error of the file system is one line, never a traceback."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a console that cannot show ² or µ shows ? instead
    try:
        app()
    except OSError as error:
        _fail(f"{error.strerror or error}: {error.filename}" if error.filename else str(error))


def _fail(message: str) -> None:
    print(f"uffuncs: {message}", file=sys.stderr)
    raise SystemExit(UNREADABLE)


def _show_version(wanted: bool) -> None:
    if wanted:
        print(f"uffuncs {__version__}")
        raise typer.Exit()


@app.callback()
def options(
    version: Annotated[bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Show the version.")] = False,
) -> None:
    """Ultrafiltration engineering functions for worksheets."""


@app.command()
def demo(
    folder: Annotated[Path, typer.Argument(help="Folder for the workbook.")] = Path("uffuncs_demo"),
    overwrite: Annotated[bool, typer.Option("--overwrite", help="Replace an earlier demo workbook.")] = False,
) -> None:
    """Build a plant's design workbook and print its key results."""
    from rich.table import Table

    from .demo import build_and_recalculate

    if folder.exists() and not folder.is_dir():
        _fail(f"{folder} is a file; name a folder")
    try:
        path, results, report = build_and_recalculate(folder, overwrite)
    except FileExistsError as error:
        _fail(f"{error.filename} is there already; name another folder, or give --overwrite")
    table = Table("Result", "Value", "Unit", title=results.title, title_justify="left")
    table.columns[1].justify = "right"
    for label, value, unit in results.rows:
        table.add_row(label, value, unit)
    console = _console()
    console.print(table)
    _print_report(console, report)
    console.print(f"Workbook: {path}", soft_wrap=True)
    raise typer.Exit(ERROR_CELLS if report.errors or report.unknown_functions else CLEAN)


@app.command()
def recalc(
    inputs: Annotated[list[Path], typer.Argument(metavar="IN.xlsx…", help="Workbooks to recalculate.")],
    output: Annotated[Optional[Path], typer.Option("-o", "--output", help="File, or folder for several workbooks.")] = None,
    in_place: Annotated[bool, typer.Option("--in-place", help="Write the results into the inputs themselves.")] = False,
    engine: Annotated[str, typer.Option(help="What evaluates the formulas: formualizer, or calc for an installed LibreOffice.")] = "formualizer",
    most: Annotated[int, typer.Option(min=0, help="Error cells listed per workbook.")] = 20,
) -> None:
    """Recalculate workbooks without a spreadsheet program.

    Only the cached values change; charts, styles, comments and macros stay as they are, and no macro is run.
    Exit status: 0 clean, 1 error cells or unknown functions, 2 an input could not be read.
    """
    from .headless import UnreadableWorkbook, recalculate

    if in_place == (output is not None):
        _fail("give either -o OUTPUT or --in-place")
    if len(inputs) > 1 and output is not None:
        if output.suffix.lower() in (".xlsx", ".xlsm"):
            _fail("several workbooks need a folder as output")
        if double := _same_names(inputs):
            _fail(f"two inputs would both be written as {double}; recalculate them into different folders")
    console = _console()
    status = CLEAN
    for path in _with_progress(inputs):
        target = None if in_place else _target(path, output, several=len(inputs) > 1)
        try:
            report = recalculate(path, target, in_place=in_place, engine=engine)
        except UnreadableWorkbook as error:
            print(f"uffuncs: {error}", file=sys.stderr)
            status = UNREADABLE
            continue
        _print_report(console, report, most)
        if report.errors or report.unknown_functions:
            status = max(status, ERROR_CELLS)
    raise typer.Exit(status)


def _same_names(inputs: list[Path]) -> str:
    seen = set()
    for path in inputs:
        if path.name.casefold() in seen:
            return path.name
        seen.add(path.name.casefold())
    return ""


def _target(path: Path, output: Path, several: bool) -> Path:
    if several or output.is_dir() or str(output).endswith(("/", "\\")):
        output.mkdir(parents=True, exist_ok=True)
        return output / path.name
    return output


def _with_progress(inputs: list[Path]):
    """The inputs, with a progress bar on the terminal where there are several."""
    if len(inputs) == 1 or not sys.stderr.isatty():
        yield from inputs
        return
    from rich.console import Console
    from rich.progress import track

    yield from track(inputs, description="Recalculating", console=Console(stderr=True))


def _console():
    from rich.console import Console

    console = Console(highlight=False)
    if not console.is_terminal:
        console.width = 120  # a file or a pipe has no width; do not break lines at 80
    return console


def _print_report(console, report, most: int = 20) -> None:
    from .headless import report_lines

    for line in report_lines(report, most):
        console.print(line, markup=False, soft_wrap=True)


@app.command()
def functions(
    what: Annotated[str, typer.Argument(metavar="[TOPIC|NAME]", help="A topic, or one function; nothing lists all.")] = "",
    markdown: Annotated[bool, typer.Option("--markdown", help="The whole reference as one Markdown page.")] = False,
) -> None:
    """List the worksheet functions, or show one whole.

    Equation, arguments with units and bounds, source, an example formula, a published value.
    """
    from . import reference
    from .registry import TOPICS, find, near_names

    if markdown:
        print(reference.markdown())
        return
    console = _console()
    wanted = what.strip()
    record = find(wanted) or find("UF_" + wanted) if wanted else None
    if record is not None:
        reference.show(console, record)
    elif wanted.casefold() in ("", *TOPICS):
        reference.show_table(console, wanted.casefold())
    else:
        near = [*near_names("UF_" + wanted.upper().removeprefix("UF_")), *near_names(wanted, list(TOPICS))]
        hint = f"; did you mean {' or '.join(near)}?" if near else f"; topics: {', '.join(TOPICS)}"
        _fail(f"there is no function or topic '{wanted}'{hint}")


class Door(str, Enum):
    """Spreadsheet programs with an add-in of ours."""

    calc = "calc"
    excel = "excel"


DoorArgument = Annotated[Door, typer.Argument(metavar="calc|excel", help="The spreadsheet program.")]


def _door(name: Door):
    """The door's module, and the exceptions by which it refuses."""
    if name is Door.calc:
        from . import calc

        return calc, calc.OfficeProblem
    from . import excel

    return excel, excel.ExcelDoorError


@app.command()
def install(door: DoorArgument) -> None:
    """Install the add-in of a spreadsheet program for this user."""
    module, refusal = _door(door)
    try:
        print("\n".join(module.install()))
    except refusal as error:
        _fail(str(error))


@app.command()
def uninstall(door: DoorArgument) -> None:
    """Remove the add-in of a spreadsheet program."""
    module, refusal = _door(door)
    try:
        print("\n".join(module.uninstall()))
    except refusal as error:
        _fail(str(error))


@app.command()
def build(
    door: DoorArgument,
    output: Annotated[Path, typer.Option("-o", "--output", help="Folder for the files.")],
) -> None:
    """Write the files of an add-in into a folder, without installing them."""
    module, refusal = _door(door)
    try:
        written = module.build(output)
    except refusal as error:
        _fail(str(error))
    for path in [written] if isinstance(written, Path) else written:
        print(path)


@app.command()
def doctor() -> None:
    """Tell what is installed where, with which Python, and what is wrong."""
    import platform

    print(f"uffuncs {__version__} on Python {platform.python_version()}, {sys.executable}")
    wrong = 0
    for name in Door:
        for finding in _door(name)[0].doctor():
            print(f"{' ' if finding.good else '!'} {finding.text}")
            wrong += not finding.good
    raise typer.Exit(1 if wrong else CLEAN)


if __name__ == "__main__":
    main()
