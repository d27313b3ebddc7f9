"""Why a cell shows an error: the failing uffuncs call, the cell it comes from, or what the code means."""

import re
from functools import cached_property

from ..cell import call
from ..errors import ErrorValue
from .engine import Reason
from .formula import tokens
from .intersection import RANGE
from .sheet import ARRAY, DYNAMIC, KEPT
from .structure import address, column_number

MEANINGS = {
    "#NULL!": "two ranges do not meet",
    "#DIV/0!": "division by zero, or an average of nothing",
    "#VALUE!": "a value of the wrong kind, such as a text where a number is needed",
    "#REF!": "a reference to a cell, sheet or workbook that is not there",
    "#NUM!": "a number outside what the function allows, or one too large",
    "#N/A": "a value is not available, such as a lookup that finds nothing",
    "#SPILL!": "the result needs more cells than are free, or than the engine spills (10,000)",
    "#CALC!": "the calculation has no result, such as an empty array",
    "#NAME?": "a name the engine does not know",
}
CELL = re.compile(r"(?:(?:'(?:[^']|'')*'|[^\W\d][\w.]*)!)?\$?[A-Za-z]{1,3}\$?[0-9]{1,7}(?![\w(.!])")
BEGIN, END = "UF__BEGIN", "UF__END"
LARGEST_RANGE = 4096  # cells searched one by one for the source of an error


def explain(book, model, evaluation, recorder, rewriter):
    """Fill evaluation.reasons for every error cell."""
    errors = {place: value.code for place, value in evaluation.values.items() if type(value) is ErrorValue}
    if not errors:
        return
    anchors = _anchors(model, evaluation)
    errors = {place: code for place, code in errors.items() if place in anchors}
    finder = _Sources(book, errors)
    sources = {place: finder.find(anchors[place], place, code) for place, code in errors.items()}
    kinds, texts = {}, {}
    for place in errors.keys() | set(anchors[place] for place in errors):
        anchor = anchors[place]
        value = book.get_value(*anchor)
        kinds[place] = value["kind"] if type(value) is dict else ""
        texts[place] = book.get_formula(*anchor) or ""
    unknown = _unknown_by_place(evaluation)
    own = {}
    for anchor in dict.fromkeys(anchors[place] for place in errors):
        formula = texts[anchor]
        if "UF_" in formula.upper() and kinds[anchor] not in ("Circ", "Error"):
            own[anchor] = formula
    local_names = {(name.sheet, name.name.casefold()) for name in model.structure.names if name.sheet}
    failures = _replayed(book, recorder, own, local_names) if own else {}
    for place, code in errors.items():
        anchor = anchors[place]
        text = _own_reason(failures.get(anchor, []), code, (place[1] - anchor[1], place[2] - anchor[2]))
        if text is not None:
            evaluation.reasons[place] = Reason(text)
    roots = _roots(sources)
    for place, code in errors.items():
        if place in evaluation.reasons:
            continue
        root = roots[place]
        if root != place:
            reason = evaluation.reasons.get(root)
            text = (
                reason.text
                if reason
                else _plain(root, errors[root], kinds, texts, unknown, rewriter, evaluation)
            )
            evaluation.reasons[place] = Reason(f"from {_shown(root)}: {text}", root)
        elif code == "#N/A" and place != anchors[place]:
            evaluation.reasons[place] = Reason(
                f"the result of the array formula in {_shown(anchors[place])} is smaller " "than its range"
            )
        else:
            evaluation.reasons[place] = Reason(
                _plain(place, code, kinds, texts, unknown, rewriter, evaluation)
            )


def _anchors(model, evaluation):
    """Each formula place to the cell that holds the formula."""
    anchors = {}
    for sheet in model.sheets:
        for cell in sheet.cells:
            if cell.kind in KEPT:
                continue
            anchor = (sheet.name, cell.row, cell.column)
            anchors[anchor] = anchor
            if cell.kind in (ARRAY, DYNAMIC):
                rows, columns = evaluation.spills.get(anchor, (1, 1))
                if cell.kind == ARRAY:
                    rows, columns = cell.area[2] - cell.row + 1, cell.area[3] - cell.column + 1
                for row in range(cell.row, cell.row + rows):
                    for column in range(cell.column, cell.column + columns):
                        anchors[sheet.name, row, column] = anchor
    return anchors


def _unknown_by_place(evaluation):
    found = {}
    for name, places in evaluation.unknown.items():
        for place in places:
            found.setdefault(place, []).append(name)
    return found


def _replayed(book, recorder, formulas, local_names):
    """The failing uffuncs calls of each cell: its formula is evaluated once more, on a sheet of its own.

    Nothing depends on those sheets, so no other cell is evaluated along with them. The row and column stay
    the same, for ROW() and for implicit intersection. A marker call before each formula tells which cell the
    calls after it belong to.
    """
    book.register_function(BEGIN, recorder.begin, min_args=1, max_args=1, deterministic=False)
    book.register_function(END, lambda *_: 0.0, min_args=2, max_args=2)
    sheets, anchors = {}, list(formulas)
    for number, anchor in enumerate(anchors):
        sheet, row, column = anchor
        if sheet not in sheets:
            name = f"replay{len(sheets)}"
            while name in book.sheet_names:
                name += "_"
            book.add_sheet(name)
            sheets[sheet] = name
        names = {name for scope, name in local_names if scope == sheet}
        formula = qualified(formulas[anchor].removeprefix("="), sheet, names)
        try:
            book.set_formula(sheets[sheet], row, column, f"={END}({BEGIN}({number}),{formula})")
        except Exception:  # the reason is then the general one of the error's code
            continue
    recorder.active = True
    try:
        book.evaluate_all()
    except Exception:
        pass
    recorder.active = False
    return {
        anchors[number]: [_Failure(*failure) for failure in failures]
        for number, failures in recorder.failures_of.items()
    }


def qualified(formula, sheet, local_names=frozenset()):
    """The formula with the sheet's name before each reference that has none."""
    prefix = "'" + sheet.replace("'", "''") + "'!"
    out, position, skip_to, previous = [], 0, 0, ""
    for kind, text in tokens(formula):
        start, position = position, position + len(text)
        if start < skip_to:
            continue
        if (kind in ("name", "quoted", "number") or text == "$") and previous not in ("!", ":", "$"):
            match = RANGE.match(formula, start) or CELL.match(formula, start)
            if match:
                out.append(match[0] if "!" in match[0] else prefix + match[0])
                skip_to, previous = match.end(), match[0]
                continue
            if (
                kind == "name"
                and text.casefold() in local_names
                and not formula.startswith(("(", "!"), position)
            ):
                text = prefix + text
        out.append(text)
        previous = text
    return "".join(out)


class _Failure:
    """One failing call, with what is asked of it for each element of an array formula worked out once."""

    def __init__(self, name, cells, result):
        self.name, self.cells, self.result = name, cells, result

    @cached_property
    def errors(self):
        """The first error value of each code in the result."""
        found = {}
        for item in _elements(self.result):
            if isinstance(item, ErrorValue):
                found.setdefault(item.code, item)
        return found

    @cached_property
    def passed(self):
        """Codes of the errors among the arguments."""
        return {item.code for cell in self.cells for item in _elements(cell) if isinstance(item, ErrorValue)}

    @cached_property
    def why(self):
        """What UF_WHY says of the same arguments."""
        return call("UF_WHY", [self.name, *self.cells])

    def gives(self, code, offset):
        value = _element(self.result, offset)
        return value.code == code if isinstance(value, ErrorValue) else code in self.errors

    def text(self, code, offset):
        """The reason in the result itself, else that of UF_WHY; it names the function."""
        value = _element(self.result, offset)
        if not isinstance(value, ErrorValue):
            value = self.errors.get(code) or next(iter(self.errors.values()))
        text = value.reason
        if not text:
            why = _element(self.why, offset)
            text = why if isinstance(why, str) else ""
        return text if self.name in text else f"{self.name}: {text or code}"


def _own_reason(failures, code, offset):
    """The reason of the innermost call that failed with the cell's code; None where the error came in."""
    index = next((i for i in range(len(failures) - 1, -1, -1) if failures[i].gives(code, offset)), None)
    while index is not None:
        failure = failures[index]
        if not failure.passed:
            return failure.text(code, offset)
        earlier = next(
            (i for i in range(index - 1, -1, -1) if failures[i].errors.keys() & failure.passed), None
        )
        if earlier is None:
            return None if code in failure.passed else failure.text(code, offset)
        index = earlier
    return None


def _element(result, offset):
    if not isinstance(result, list):
        return result
    row, column = offset
    row = 0 if len(result) == 1 else row
    column = 0 if result and len(result[0]) == 1 else column
    return result[row][column] if row < len(result) and column < len(result[row]) else None


def _elements(result):
    if isinstance(result, list):
        for row in result:
            yield from row
    else:
        yield result


class _Sources:
    """Finds the error cell among the cells a formula reads that its own error comes from."""

    def __init__(self, book, errors):
        self.book = book
        self.errors = errors
        self.by_sheet = {}
        for sheet, row, column in errors:
            self.by_sheet.setdefault(sheet, []).append((row, column))
        self.found = {}

    def find(self, anchor, place, code):
        key = (anchor, code)
        if key not in self.found:
            self.found[key] = self._search(anchor, code)
        return self.found[key]

    def _search(self, anchor, code):
        sheet, row, column = anchor
        try:
            report = self.book.precedents("'" + sheet.replace("'", "''") + "'!" + address(row, column))
        except Exception:
            return None
        for precedent in report.precedents:
            text = _referenced(precedent.reference)
            found = text and self._among(text, code, anchor)
            if found:
                return found
        return None

    def _among(self, text, code, anchor):
        sheet, _, area = text.rpartition("!")
        if sheet.startswith("'"):
            sheet = sheet[1:-1].replace("''", "'")
        bounds = _bounds(area)
        if bounds is None:
            return None
        first_row, first_column, last_row, last_column = bounds
        if (last_row - first_row + 1) * (last_column - first_column + 1) <= LARGEST_RANGE:
            for row in range(first_row, last_row + 1):
                for column in range(first_column, last_column + 1):
                    place = (sheet, row, column)
                    if self.errors.get(place) == code and place != anchor:
                        return place
            return None
        for row, column in self.by_sheet.get(sheet, ())[:LARGEST_RANGE]:
            place = (sheet, row, column)
            if (
                first_row <= row <= last_row
                and first_column <= column <= last_column
                and self.errors[place] == code
                and place != anchor
            ):
                return place
        return None


def _referenced(reference):
    """The address text of a precedent, whichever kind it is."""
    for holder in (reference, getattr(reference, "resolution", None)):
        for name in ("address", "resolved", "declared"):
            text = getattr(holder, name, None)
            if text:
                return str(text)
    return None


def _bounds(area):
    first, _, last = area.replace("$", "").partition(":")
    corners = []
    for text, edge in ((first, 0), (last or first, 1)):
        letters = text.rstrip("0123456789")
        digits = text[len(letters) :]
        if letters and not letters.isalpha():
            return None
        corners.append(
            (
                int(digits) if digits else (1, 1_048_576)[edge],
                column_number(letters) if letters else (1, 16_384)[edge],
            )
        )
    return corners[0] + corners[1] if corners else None


def _roots(sources):
    """The cell each error started in; a cell of a circle is its own root."""
    roots = {}
    for place in sources:
        chain, here = {}, place
        while here not in roots and here not in chain:
            chain[here] = None
            before = sources.get(here)
            if before is None:
                roots[here] = here
            else:
                here = before
        if here in roots:
            root = roots[here]
        else:  # a circle: each of its cells is a root
            root = here
            circle = list(chain)[list(chain).index(here) :]
            roots |= {cell: cell for cell in circle}
        for cell in chain:
            roots.setdefault(cell, root)
    return roots


def _shown(place):
    sheet, row, column = place
    return f"{sheet}!{address(row, column)}"


def _unreadable(detail):
    """The engine's parser in plain words: where it stopped, and what it missed."""
    found = re.search(r"at position (\d+): ([^{]*)", detail)
    if not found:
        return "the formula cannot be read"
    what = found[2].partition(", got ")[0].strip()
    return f"the formula cannot be read near character {found[1]}: {what[:1].lower()}{what[1:]}"


def _plain(place, code, kinds, texts, unknown, rewriter, evaluation):
    """The reason of an error that neither a uffuncs function nor another cell explains."""
    kind, formula = kinds.get(place, ""), texts.get(place, "")
    if kind == "Circ":
        return "circular reference: the formula depends on its own cell"
    if kind == "Error" or formula.startswith("=#ERROR!"):
        return _unreadable(formula.partition("#ERROR!:")[2])
    if place in unknown and code == "#NAME?":
        return f"there is no function {' or '.join(unknown[place])}"
    if kind == "NImpl":
        return "the formula uses something the engine does not support"
    value = evaluation.values.get(place)
    if isinstance(value, ErrorValue) and value.reason:
        return value.reason
    if code == "#NAME?":
        lowered = formula.casefold()
        for name, problem in rewriter.problems.items():
            if name in lowered:
                return problem
    return MEANINGS.get(code, code)
