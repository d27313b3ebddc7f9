"""Recalculate a workbook without a spreadsheet program."""

from pathlib import Path
from time import perf_counter

from ..errors import shortened
from .engine import Model, engine_named
from .formula import calls_own
from .package import Package, output_path, parse_xml, local, save_parts
from .patch import patch_sheet
from .report import Change, ErrorCell, Report, UnknownFunction
from .sheet import DATA_TABLE, KEPT, read_sheet
from .structure import address, read_structure


def recalculate(path, output=None, in_place=False, engine="formualizer", progress=None):
    """Evaluate every formula of a workbook and write the values into a copy of it.

    Only the values a workbook remembers with its formulas are written; every other part stays byte for byte
    as it was. Macros are kept and never run.

    Parameters
    ----------
    path : path
        Workbook (.xlsx, .xlsm).
    output : path or None
        File or existing folder of the result. It must not be the input, unless `in_place` is given.
    in_place : bool
        Allow to write over the input; without `output` the input is the output.
    engine : str or object
        Name of the engine, or an engine itself.
    progress : callable or None
        Called with the name of each stage: read, load, evaluate, explain, patch.

    Returns
    -------
    Report

    Raises
    ------
    UnreadableWorkbook
        The workbook or the output is refused; nothing was written.
    """
    started = perf_counter()
    progress = progress or (lambda stage: None)
    evaluator = engine_named(engine) if isinstance(engine, str) else engine
    progress("read")
    model = read_model(path)
    target = output_path(path, output, in_place)
    read = perf_counter()
    report = Report(Path(path), target, evaluator.name)
    _count_formulas(model, report)
    parts = {}
    timings = {"read": read - started}
    patched = read
    if report.formulas:
        evaluation = evaluator.evaluate(model, progress)
        timings |= evaluation.timings
        progress("patch")
        patched = perf_counter()
        parts = _patch(model, evaluation, report)
        _collect(model, evaluation, report)
    save_parts(model.package, target, parts)
    timings["patch"] = perf_counter() - patched
    report.timings = timings
    report.seconds = perf_counter() - started
    return report


def read_model(path):
    """Read and check a workbook."""
    package = Package(path)
    structure = read_structure(package)
    package.check_document_types()
    return Model(
        package, structure, [read_sheet(package, name, part) for name, part in structure.sheets.items()]
    )


def _count_formulas(model, report):
    own_names = {name.name.casefold() for name in model.structure.names if calls_own(name.definition)}
    tables = 0
    for sheet in model.sheets:
        for cell in sheet.cells:
            if cell.kind in KEPT:
                tables += cell.kind == DATA_TABLE
                continue
            report.formulas += 1
            formula = sheet.formula_of(cell)
            if calls_own(formula):
                report.own_formulas += 1
            elif own_names and any(name in formula.casefold() for name in own_names):
                report.own_formulas += 1
    if tables:
        report.notes.append(f"{tables:,} what-if data tables are left as they are")


def _patch(model, evaluation, report):
    strings = _SharedStrings(model)
    parts = {}
    for sheet in model.sheets:
        if not sheet.cells:
            continue

        def on_change(row, column, before, after, name=sheet.name):
            if before is None:
                report.filled += 1
            else:
                report.changes.append(Change(name, address(row, column), before, after))

        data = patch_sheet(model.package, sheet, evaluation, strings, on_change)
        if data is not None:
            parts[sheet.part] = data
    return parts


class _SharedStrings:
    """Texts of the shared strings, read when a formula cell points into them."""

    def __init__(self, model):
        self.model = model
        self.texts = None

    def __call__(self, index):
        if self.texts is None:
            self.texts = self._read()
        index = index.strip()
        return self.texts[int(index)] if index.isdigit() and int(index) < len(self.texts) else ""

    def _read(self):
        part, package = self.model.structure.shared_strings_part, self.model.package
        if part is None:
            return []
        texts, inside = [], []

        def start(tag, attributes):
            tag = local(tag)
            if tag == "si":
                texts.append("")
            inside.append(tag)

        def end(tag):
            inside.pop()

        def text(piece):
            if inside and inside[-1] == "t" and "rPh" not in inside:
                texts[-1] += piece

        parse_xml(package.read_xml(part), package.label, part, start, end, text)
        return texts


def _collect(model, evaluation, report):
    """Error cells in the workbook's order, unknown functions, notes."""
    formulas = {}
    for sheet in model.sheets:
        for cell in sheet.cells:
            formulas[sheet.name, cell.row, cell.column] = (sheet, cell)
    order = {sheet.name: number for number, sheet in enumerate(model.sheets)}
    for place in sorted(evaluation.reasons, key=lambda place: (order[place[0]], *place[1:])):
        reason = evaluation.reasons[place]
        name, row, column = place
        formula = formulas.get(place)
        source = f"{reason.source[0]}!{address(*reason.source[1:])}" if reason.source else ""
        report.errors.append(
            ErrorCell(
                name,
                address(row, column),
                evaluation.values[place].code,
                shortened(reason.text),
                "=" + formula[0].formula_of(formula[1]) if formula else "",
                source,
            )
        )
    for name, places in sorted(evaluation.unknown.items()):
        report.unknown_functions.append(
            UnknownFunction(name, [(sheet, address(row, column)) for sheet, row, column in places])
        )
    report.notes += evaluation.notes
