"""Rewrite a formula, as saved, into one the engine understands; literal texts are never touched.

What is rewritten: prefixes before the names of uffuncs functions, omitted arguments of those functions,
structured references to tables, and defined names whose definition the engine cannot hold.
"""

import re
from dataclasses import dataclass, field

from .structured import table_reference

OMITTED = "UF__OMITTED"
OWN = re.compile(r"(?:.*\.)?(UF_\w+)$", re.IGNORECASE | re.DOTALL)
OWN_CALL = re.compile(r"(?<![\w])UF_\w+\(", re.IGNORECASE)
MAX_INLINE_DEPTH = 16

TOKEN = re.compile(
    r"""(?P<text>"(?:[^"]|"")*")"""
    r"""|(?P<quoted>'(?:[^']|'')*')"""
    r"""|(?P<bracket>\[)"""
    r"""|(?P<error>\#(?:N/A|NULL!|DIV/0!|VALUE!|REF!|NAME\?|NUM!|SPILL!|CALC!|GETTING_DATA))"""
    r"""|(?P<name>[^\W\d][\w.\\?]*|\\[\w.\\?]*)"""
    r"""|(?P<number>\d[\w.]*)"""
    r"""|(?P<space>\s+)"""
    r"""|(?P<other>.)""",
    re.DOTALL | re.VERBOSE,
)
BRACKET = re.compile(r"'.|[\[\]]", re.DOTALL)
CALLED = re.compile(r"([^\W\d][\w.]*)\(")
TEXT = re.compile(r'"(?:[^"]|"")*"')
PLAIN_DEFINITION = re.compile(r"""[^(\[]*""")
REFERENCE = re.compile(
    r"\$?[A-Za-z]{1,3}\$?\d+(?::\$?[A-Za-z]{1,3}\$?\d+)?|\$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}"
    r"|\$?\d+:\$?\d+|[^\W\d][\w.]*"
)
RELATIVE = re.compile(r"(?<![\w$.!'])(?:[A-Za-z]{1,3}\$?[0-9]{1,7}|\$[A-Za-z]{1,3}[0-9]{1,7})(?![\w(.!])")


def tokens(formula):
    """(kind, text) pairs that join up to the formula again; a bracket comes with all it holds."""
    position, length = 0, len(formula)
    while position < length:
        match = TOKEN.match(formula, position)
        kind, end = match.lastgroup, match.end()
        if kind == "bracket":
            depth = 1
            while depth:
                inner = BRACKET.search(formula, end)
                if inner is None:
                    end = length
                    break
                end = inner.end()
                depth += {"[": 1, "]": -1}.get(inner[0], 0)
        yield kind, formula[position:end]
        position = end


def called_names(formula):
    """Names of the functions a formula calls, as written, texts left out."""
    if '"' in formula:
        formula = TEXT.sub('""', formula)
    return CALLED.findall(formula)


def calls_own(formula):
    """Whether a formula calls a uffuncs function (texts left out)."""
    if OWN_CALL.search(formula) is None:
        return False
    return '"' not in formula or OWN_CALL.search(TEXT.sub('""', formula)) is not None


def own_name(name):
    """UF_X of UF_X, _xll.UF_X or ORG.THING.UF_X; None of any other name."""
    match = OWN.match(name)
    return match[1].upper() if match else None


@dataclass(slots=True)
class Rewriter:
    """Rewrites the formulas of one workbook."""

    tables: dict  # casefolded name -> Table
    names: list  # DefinedName
    inlined: dict = field(default_factory=dict)  # (casefolded name, sheet or None) -> definition
    problems: dict = field(default_factory=dict)  # casefolded name -> why it cannot be used
    area_names: frozenset = frozenset()  # casefolded names of ranges
    lifted: set = field(default_factory=set)  # native functions to evaluate element by element
    trigger: re.Pattern = None

    def __post_init__(self):
        for name in self.names:
            self._consider(name)
        self.area_names = frozenset(
            name.name.casefold()
            for name in self.names
            if ":" in name.definition and (name.name.casefold(), name.sheet) not in self.inlined
        )
        words = {name for name, _ in self.inlined} | set(self.tables)
        alternatives = "|".join(re.escape(word) for word in sorted(words, key=len, reverse=True))
        self.trigger = re.compile(
            r"[.!]\s*UF_|,\s*[,)]|\(\s*,|_xlfn\.SINGLE\("
            + (r"|\[" if self.tables else "")
            + (rf"|(?<![\w.])(?:{alternatives})(?![\w(])" if words else ""),
            re.IGNORECASE,
        )

    def _consider(self, name):
        """The engine drops names that call functions it does not know while loading: they are written out."""
        definition = name.definition
        bare = TEXT.sub('""', definition)
        calls = PLAIN_DEFINITION.fullmatch(bare) is None
        mentions = any(
            kind == "name" and other.casefold() in self.tables for kind, other in tokens(definition)
        )
        if not (calls or mentions or self._mentions_inlined(definition)) or name.name.startswith("_xlnm."):
            return
        if RELATIVE.search(re.sub(r"'(?:[^']|'')*'!|[\w.]+!", "", bare)):
            self.problems[name.name.casefold()] = f"the defined name {name.name} holds relative references"
            return
        self.inlined[name.name.casefold(), name.sheet] = definition

    def _mentions_inlined(self, definition):
        known = {name for name, _ in self.inlined}
        return any(kind == "name" and text.casefold() in known for kind, text in tokens(definition))

    def rewrite(self, formula, sheet, row, column=1):
        """The formula for the engine; the same object where there is nothing to do."""
        if self.trigger.search(formula) is None:
            return formula
        return self._rewrite(formula, sheet, row, 0)

    def _rewrite(self, formula, sheet, row, depth):
        parts = list(tokens(formula))
        out, stack = [], []  # stack: True inside the parentheses of a uffuncs call
        empty = False  # nothing but space since the last "(" or "," of such a call
        count = len(parts)
        index = 0
        while index < count:
            kind, text = parts[index]
            if kind == "space":
                out.append(text)
                index += 1
                continue
            if text == "(":
                own = bool(out) and self._is_own(parts, index)
                stack.append(own)
                out.append(text)
                empty = own
            elif text == "," and stack and stack[-1]:
                if empty:
                    out.append(OMITTED + "()")
                out.append(text)
                empty = True
            elif text == ")":
                if stack and stack.pop() and empty and not self._opens(out):
                    out.append(OMITTED + "()")
                out.append(text)
                empty = False
            else:
                if text == "{":  # commas of an array constant separate columns
                    stack.append(False)
                elif text == "}" and stack:
                    stack.pop()
                empty = False
                index += self._operand(parts, index, out, sheet, row, depth)
                continue
            index += 1
        return "".join(out)

    @staticmethod
    def _is_own(parts, index):
        kind, text = parts[index - 1]
        return kind == "name" and own_name(text) is not None

    @staticmethod
    def _opens(out):
        """Whether the last thing written is an opening parenthesis: a call without arguments stays one."""
        return next((text for text in reversed(out) if not text.isspace()), "") == "("

    def _operand(self, parts, index, out, sheet, row, depth):
        """Write the operand at `index`; the number of tokens it took."""
        kind, text = parts[index]
        next_kind, following = parts[index + 1] if index + 1 < len(parts) else ("", "")
        if kind == "name" and following == "(":
            out.append(self._function(text, out))
            return 1
        if kind == "name" and following != "!":
            qualifier = _qualifier(out)
            if qualifier is None and (table := self.tables.get(text.casefold())):
                bracket = following if next_kind == "bracket" else ""
                out.append(table_reference(table, bracket, sheet, row))
                return 2 if bracket else 1
            definition = self._definition(text, sheet if qualifier is None else qualifier)
            if definition is not None and depth < MAX_INLINE_DEPTH:
                if qualifier is not None:
                    del out[-2:]
                out.append(f"({self._rewrite(definition, sheet, row, depth + 1)})")
                return 1
        if kind == "bracket" and next_kind != "name" and following != "!" and _stands_alone(out):
            here = self._table_at(sheet, row)
            if here is not None:
                out.append(table_reference(here, text, sheet, row))
                return 1
        out.append(text)
        return 1

    @staticmethod
    def _function(text, out):
        own = own_name(text)
        if own:
            _drop_qualifier(out)
            return own
        return "@" if text.casefold() == "_xlfn.single" else text

    def _definition(self, text, sheet):
        key = text.casefold()
        return self.inlined.get((key, sheet), self.inlined.get((key, None)))

    def _table_at(self, sheet, row):
        """The table an unqualified [@column] belongs to: the one on this row of this sheet, if just one."""
        here = [
            table
            for table in self.tables.values()
            if table.sheet == sheet and table.first_row <= row <= table.last_row
        ]
        return here[0] if len(here) == 1 else None


def _qualifier(out):
    """The sheet name written just before, as in Sheet1!name; None where there is none."""
    if len(out) < 2 or out[-1] != "!":
        return None
    text = out[-2]
    return text[1:-1].replace("''", "'") if text.startswith("'") else text


def _stands_alone(out):
    """Whether a bracket that comes next is an operand of its own, not the end of a reference."""
    return not out or not (out[-1][-1].isalnum() or out[-1][-1] in "_.]'")


def _drop_qualifier(out):
    """Remove [1]! or 'C:\\folder\\file.xlam'! or file.xlam! written just before a function's name."""
    if out and out[-1] == "!":
        out.pop()
        if out:
            out.pop()
        while out and out[-1].startswith("["):
            out.pop()


def without_external_references(formula):
    """The formula with each reference to another workbook replaced by #REF!."""
    out, parts, index = [], list(tokens(formula)), 0
    while index < len(parts):
        kind, text = parts[index]
        end = index
        if kind == "bracket" and _stands_alone(out):
            while (
                end < len(parts) and parts[end][1] != "!" and parts[end][0] in ("bracket", "name", "number")
            ):
                end += 1
        elif kind == "quoted" and "[" in text:
            end += 1
        if end > index and end < len(parts) and parts[end][1] == "!":
            match = REFERENCE.match("".join(piece for _, piece in parts[end + 1 :]))
            if match:
                out.append("#REF!")
                rest = "".join(piece for _, piece in parts[end + 1 :])[match.end() :]
                parts, index = list(tokens(rest)), 0
                continue
        out.append(text)
        index += 1
    return "".join(out)
