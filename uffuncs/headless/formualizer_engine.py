"""The engine `formualizer`: loads the engine's copy, evaluates it, and reads values and reasons back."""

import re
import threading
from time import perf_counter

from ..errors import ErrorValue
from .adapter import Recorder, adapted, from_engine
from .builtin import FIT, NATIVES, fit, omitted
from .elementwise import COLUMNS, EACH, ROWS, column_numbers, each, row_numbers
from .engine import Evaluation
from .formula import OMITTED, Rewriter, called_names, own_name, without_external_references
from .package import UnreadableWorkbook
from .prepare import engine_copy
from .reasons import explain
from .sheet import ARRAY, DYNAMIC, KEPT
from .structure import address, parse_area

STACK_BYTES = 256 * 1024**2
VERSION = "0.13."
LAMBDA_FUNCTIONS = {"LAMBDA", "MAP", "BYROW", "BYCOL", "REDUCE", "SCAN", "MAKEARRAY"}
#: Native functions that can give more than one value without naming a range.
BLOCK_FUNCTIONS = ("SEQUENCE", "RANDARRAY", "MUNIT", "TEXTSPLIT", "INDIRECT", "OFFSET", "MAKEARRAY", "EXPAND")
PREFIXES = re.compile(r"^(?:_xlfn\.|_xlws\.|_xll\.)+", re.IGNORECASE)
CALL = re.compile(rb"([A-Za-z_\\\x80-\xff][\w.\\\x80-\xff]*)\(")


class FormualizerEngine:
    """Evaluates with the Python package formualizer, version 0.13."""

    name = "formualizer"

    def evaluate(self, model, progress=None):
        """Evaluate on a thread of its own, which has a deep stack and can be interrupted."""
        run = _Run(model, progress)
        outcome = []

        def work():
            import numpy as np

            try:
                with np.errstate(all="ignore"):  # what has no value becomes an error value, not a line on the terminal
                    outcome.append(run.evaluate())
            except BaseException as error:  # handed to the calling thread
                outcome.append(error)

        previous = threading.stack_size(STACK_BYTES)
        try:
            thread = threading.Thread(target=work, name="recalculation", daemon=True)
            thread.start()
        finally:
            threading.stack_size(previous)
        try:
            thread.join()
        except BaseException:
            run.cancel()
            thread.join()
            raise
        if isinstance(outcome[0], BaseException):
            raise outcome[0]
        return outcome[0]


class _Run:
    """One evaluation of one workbook."""

    def __init__(self, model, progress):
        self.model = model
        self.progress = progress or (lambda stage: None)
        self.recorder = Recorder()
        self.evaluation = Evaluation()
        self.book = None
        self.rewriter = Rewriter(model.structure.tables, model.structure.names)

    def cancel(self):
        self.recorder.cancelled = True
        if self.book is not None:
            self.book.cancel()

    def evaluate(self):
        self.progress("load")
        started = perf_counter()
        self._load()
        loaded = perf_counter()
        self.progress("evaluate")
        self._calculate()
        self._intersect()
        self._read_values()
        evaluated = perf_counter()
        self.progress("explain")
        self._find_unknown()
        explain(self.book, self.model, self.evaluation, self.recorder, self.rewriter)
        self.evaluation.timings = {
            "load": loaded - started,
            "evaluate": evaluated - loaded,
            "explain": perf_counter() - evaluated,
        }
        return self.evaluation

    # --- load -------------------------------------------------------------------------------------

    def _load(self):
        formualizer = _formualizer(self.evaluation.notes)
        data, further = engine_copy(self.model, self.rewriter)
        config = formualizer.EvaluationConfig()
        config.enable_parallel = False  # callbacks then run on this thread
        if self.model.structure.date_1904:
            config.date_system = "1904"
        try:
            book = formualizer.Workbook.from_bytes(
                data, config=formualizer.WorkbookConfig(eval_config=config)
            )
        except Exception as error:
            reason = " ".join(str(error).split())[:200]
            raise UnreadableWorkbook(
                f"{self.model.package.label}: the engine cannot load it ({reason})"
            ) from None
        book.set_temporal_egress("serial")
        self.book = book
        known = set(book.sheet_names)
        for sheet in self.model.sheets:
            if sheet.cells and sheet.name not in known:
                raise UnreadableWorkbook(
                    f"{self.model.package.label}: the engine cannot read sheet {sheet.name!r}"
                )
        self.called = self._called_names()
        for name in sorted({own_name(name) for name in self.called if own_name(name)}):
            if _known_own(name):
                book.register_function(name, adapted(name, self.recorder), min_args=0, max_args=None)
        book.register_function(OMITTED, omitted, min_args=0, max_args=0)
        book.register_function(FIT, fit, min_args=3, max_args=5)
        for name, (function, count) in NATIVES.items():
            if _lacks(name):
                book.register_function(name, function, min_args=count, max_args=count)
        for name in self.rewriter.lifted:
            book.register_function(EACH + name.replace(".", "_"), each(name), min_args=0, max_args=None)
        book.register_function(ROWS, row_numbers, min_args=2, max_args=2)
        book.register_function(COLUMNS, column_numbers, min_args=2, max_args=2)
        for sheet, row, column, formula in further:
            book.set_formula(sheet, row, column, formula)

    def _called_names(self):
        """Names called anywhere in the workbook, as written; texts may add a few that are none."""
        found = set()
        for sheet in self.model.sheets:
            if sheet.cells:
                found |= set(CALL.findall(sheet.data, *sheet.content))
        names = {name.decode("utf-8", "replace") for name in found}
        for defined in self.model.structure.names:
            names |= set(called_names(defined.definition))
        return names

    # --- evaluate ---------------------------------------------------------------------------------

    def _calculate(self):
        try:
            self.book.evaluate_all()
        except Exception:
            if self.recorder.cancelled:
                raise
            self._calculate_singly()

    def _calculate_singly(self):
        """One refused formula stops a whole evaluation: find the refused ones, and mark them as errors."""
        refused = []
        for sheet, cell in self._formulas():
            formula = sheet.formula_of(cell)
            if "[" in formula and self._fails(sheet, cell) is not None:
                current = (self.book.get_formula(sheet.name, cell.row, cell.column) or "").removeprefix("=")
                self._replace(sheet, cell, "=" + without_external_references(current), "=#REF!")
                refused.append((sheet, cell))
        if refused:
            self.evaluation.notes.append(
                f"{len(refused):,} cells read another workbook whose values this file does not hold: "
                f"#REF!, first "
                f"{refused[0][0].name}!{address(refused[0][1].row, refused[0][1].column)}"
            )
        try:
            self.book.evaluate_all()
            return
        except Exception:
            pass
        for sheet, cell in self._formulas():
            failure = self._fails(sheet, cell)
            if failure is not None:
                self._replace(sheet, cell, "=#VALUE!", "=#VALUE!")
                self.evaluation.notes.append(
                    f"{sheet.name}!{address(cell.row, cell.column)}: the engine refused the formula "
                    f"({' '.join(str(failure).split())[:120]})"
                )
        try:
            self.book.evaluate_all()
        except Exception as error:
            reason = " ".join(str(error).split())[:200]
            raise UnreadableWorkbook(
                f"{self.model.package.label}: the engine cannot evaluate it ({reason})"
            ) from None

    def _fails(self, sheet, cell):
        try:
            self.book.evaluate_cell(sheet.name, cell.row, cell.column)
        except Exception as error:
            return error
        return None

    def _replace(self, sheet, cell, formula, otherwise):
        try:
            self.book.set_formula(sheet.name, cell.row, cell.column, formula)
        except Exception:
            self.book.set_formula(sheet.name, cell.row, cell.column, otherwise)

    def _formulas(self):
        for sheet in self.model.sheets:
            for cell in sheet.cells:
                if cell.kind not in KEPT:
                    yield sheet, cell

    def _intersect(self):
        """Formulas that were not entered as array formulas show one value and never spill."""
        blocks = []
        suspects = self._may_give_blocks()
        for sheet, cell in self._formulas():
            if cell.kind in (ARRAY, DYNAMIC) or suspects.search(sheet.formula_of(cell)) is None:
                continue
            place = (sheet.name, cell.row, cell.column)
            if self._spilled(*place):
                formula = (self.book.get_formula(*place) or "").removeprefix("=")
                self._replace(sheet, cell, f"=@({formula})", "=#VALUE!")
                blocks.append(f"{sheet.name}!{address(cell.row, cell.column)}")
        if blocks:
            self._calculate()
            self.evaluation.notes.append(
                f"{len(blocks):,} formulas give several values but are no array formulas: one is shown, "
                f"as a spreadsheet program would; first cell {blocks[0]}"
            )

    def _may_give_blocks(self):
        """Pattern of the formulas that can give more than one value; asking the engine of each is slower."""
        words = [re.escape(name.name) for name in self.model.structure.names]
        words += [rf"(?:{name})\(" for name in BLOCK_FUNCTIONS]
        words += [re.escape(table.name) for table in self.model.structure.tables.values()]
        if self.recorder.gave_block:
            words.append("UF_")
        return re.compile("[:{#\\[]|" + "|".join(words), re.IGNORECASE)

    def _spilled(self, sheet, row, column):
        """Whether a cell spills, or is kept from spilling."""
        value = self.book.get_value(sheet, row, column)
        if type(value) is dict:
            return value["kind"] == "Spill"
        role = self.book.inspect_cell(_quoted(sheet, row, column), include_values=False).cell.spill
        return role is not None and role.extent is not None

    # --- read back --------------------------------------------------------------------------------

    def _read_values(self):
        values, get = self.evaluation.values, self.book.get_value
        lost = []
        for sheet in self.model.sheets:
            name = sheet.name
            for cell in sheet.cells:
                if cell.kind in KEPT:
                    continue
                row, column = cell.row, cell.column
                value = get(name, row, column)
                if value is None and self.book.get_formula(name, row, column) is None:
                    lost.append(f"{name}!{address(row, column)}")  # no value is better than a wrong one
                    continue
                values[name, row, column] = (
                    value if type(value) is float and abs(value) < 1e300 else from_engine(value)
                )
                if cell.kind in (ARRAY, DYNAMIC):
                    self._read_block(sheet, cell)
        if lost:
            self.evaluation.notes.append(
                f"{len(lost):,} formulas were not read by the engine and keep their values; first {lost[0]}"
            )

    def _read_block(self, sheet, cell):
        rows, columns = 1, 1
        if cell.kind == ARRAY:
            rows, columns = cell.area[2] - cell.row + 1, cell.area[3] - cell.column + 1
        else:
            role = self.book.inspect_cell(
                _quoted(sheet.name, cell.row, cell.column), include_values=False
            ).cell.spill
            if role is not None and role.extent:
                area = parse_area(role.extent.rpartition("!")[2])
                if area:
                    rows, columns = area[2] - cell.row + 1, area[3] - cell.column + 1
            self.evaluation.spills[sheet.name, cell.row, cell.column] = (rows, columns)
        values = self.evaluation.values
        anchor = values[sheet.name, cell.row, cell.column]
        for row in range(cell.row, cell.row + rows):
            for column in range(cell.column, cell.column + columns):
                value = from_engine(self.book.get_value(sheet.name, row, column))
                if value is None and isinstance(anchor, ErrorValue):
                    value = anchor  # the formula failed as a whole: so does every cell of its range
                values[sheet.name, row, column] = value

    # --- functions nobody knows -------------------------------------------------------------------

    def _find_unknown(self):
        unknown = {name for name in self.called if self._is_unknown(name)}
        if not unknown:
            return
        for sheet, cell in self._formulas():
            formula = sheet.formula_of(cell)
            written_out = self.rewriter.rewrite(formula, sheet.name, cell.row)
            for name in dict.fromkeys(called_names(formula) + called_names(written_out)):
                if name in unknown:
                    shown = own_name(name) or PREFIXES.sub("", name).upper()
                    places = self.evaluation.unknown.setdefault(shown, [])
                    place = (sheet.name, cell.row, cell.column)
                    if not places or places[-1] != place:
                        places.append(place)

    @staticmethod
    def _is_unknown(name):
        own = own_name(name)
        if own:
            return not _known_own(own)
        bare = PREFIXES.sub("", name).upper()
        if (
            name.casefold().startswith(("_xlpm.", "_xludf."))
            or bare in NATIVES
            or name.casefold() == "_xlfn.single"
        ):
            return False
        return bare in LAMBDA_FUNCTIONS or _lacks(name)


def _formualizer(notes):
    """The package, or a refusal that says what to do; another version than the tested one is noted."""
    from importlib.metadata import PackageNotFoundError, version

    try:
        import formualizer

        found = version("formualizer")
    except (ImportError, PackageNotFoundError):
        raise UnreadableWorkbook(
            "the engine needs the Python package formualizer 0.13; install it and try again"
        ) from None
    if not found.startswith(VERSION):
        notes.append(f"the engine formualizer is version {found}; tested is {VERSION}x")
    return formualizer


def _quoted(sheet, row, column):
    return "'" + sheet.replace("'", "''") + "'!" + address(row, column)


def _known_own(name):
    from ..registry import find

    return find(name) is not None


_PROBED = {}
_PROBE = []


def _lacks(name):
    """Whether the engine does not know a native function: it then calls the formula's name unknown."""
    known = _PROBED.get(name)
    if known is None:
        import formualizer

        if not _PROBE:
            _PROBE.append(formualizer.Workbook())
            _PROBE[0].add_sheet("probe")
        try:
            _PROBE[0].set_formula("probe", 1, 1, f"={name}()")
            value = _PROBE[0].evaluate_cell("probe", 1, 1)
            known = isinstance(value, dict) and value.get("kind") == "Name"
        except Exception:
            known = True
        _PROBED[name] = known
    return known
