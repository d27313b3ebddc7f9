"""What Excel and VBA allow as names and texts, and the names that arguments get there."""

from __future__ import annotations

import re
from functools import partial

from ..declaration import Function, Tool
from .errors import ExcelDoorError

#: Longest description, of a function or of an argument, that the function wizard takes.
LONGEST_TEXT = 255
#: Most characters of all argument names of a function, with one more for each.
LONGEST_NAMES = 254
MOST_ARGUMENTS = 60

#: Reserved identifiers of VBA (MS-VBAL, section 3.3.5.2), and words that its statements use: one name that
#: the editor refuses would take every function along. `caller` is filled by xlwings itself.
_RESERVED = """
abs addressof and any array as attribute boolean byref byte byval call caller case cbool cbyte ccur cdate
cdbl cdec cdecl cint circle clng clnglng clngptr close const csng cstr currency cvar cverr date debug
decimal declare defbool defbyte defcur defdate defdbl defdec defint deflng deflnglng deflngptr defobj defsng
defstr defvar dim do doevents double each else elseif empty end endif enum eqv erase event exit false fix
for friend function get global gosub goto if imp implements in input inputb int integer is lbound len lenb
let like linput local lock long longlong longptr loop lset me mod new next not nothing null on open option
optional or paramarray preserve print private pset public put raiseevent redim rem resume return rset scale
seek select set sgn shared single spc static stop string sub tab then to true type typeof ubound unlock
until variant wend while with withevents write xor access alias append base beep binary chdir chdrive class
compare error explicit filecopy kill lib line load mid midb mkdir module name object output property random
randomize read reset rmdir sendkeys setattr step text time unload width
"""
RESERVED = frozenset(_RESERVED.split())

_IDENTIFIER = re.compile(r"[A-Za-z][A-Za-z0-9_]{0,254}")
_A1 = re.compile(r"([A-Za-z]{1,3})([0-9]{1,7})")
_R1C1 = re.compile(r"[Rr][0-9]*([Cc][0-9]*)?|[Cc][0-9]*")


def reads_as_cell(name: str) -> bool:
    """Whether a formula would take the name for a cell: UF1, R1C1, C2; a sheet ends at XFD1048576."""
    if found := _A1.fullmatch(name):
        column = 0
        for letter in found[1].upper():
            column = 26 * column + ord(letter) - 64
        return column <= 16384 and 1 <= int(found[2]) <= 1_048_576
    return bool(_R1C1.fullmatch(name))


def argument_names(record: Function | Tool) -> list[str]:
    """The arguments' names as VBA parameters: reserved words get an underscore, and too much text is cut."""
    names = [a.name + "_" if a.name.casefold() in RESERVED else a.name for a in record.arguments]
    if getattr(record, "variadic", False):
        names.append("cells")
    while sum(map(len, names)) + len(names) > LONGEST_NAMES:
        i = max(range(len(names)), key=lambda n: max(map(len, names[n].split("_"))))
        words = names[i].split("_")
        longest = max(range(len(words)), key=lambda n: len(words[n]))
        words[longest] = words[longest][:-1]
        shorter = "_".join(words)
        if len(words[longest]) < 3 or shorter in names or shorter.casefold() in RESERVED:
            raise ExcelDoorError(
                f"{record.worksheet_name}: the names of its arguments are too long for the function wizard"
            )
        names[i] = shorter
    return names


def _refusal(name: str, cause: str) -> ExcelDoorError:
    return ExcelDoorError(f"{name}: {cause}")


def check(records) -> None:
    """Refuse what Excel or VBA would not take.

    Raises
    ------
    ExcelDoorError
        Names the function and the limit.
    """
    seen = set()
    for record in records:
        name, names = record.worksheet_name, argument_names(record)
        wrong = partial(_refusal, name)

        if not _IDENTIFIER.fullmatch(name) or name.casefold() in RESERVED:
            raise wrong("not a name that VBA allows")
        if reads_as_cell(name):
            raise wrong("Excel reads the name as a cell")
        if name.casefold() in seen:
            raise wrong("declared twice, upper and lower case being the same")
        seen.add(name.casefold())
        if getattr(record, "variadic", False) and len(names) == 1:
            raise wrong("further cells need an argument before them")
        if len(names) > MOST_ARGUMENTS:
            raise wrong(f"more than {MOST_ARGUMENTS} arguments")
        for argument in names:
            if not _IDENTIFIER.fullmatch(argument) or argument.casefold() in RESERVED:
                raise wrong(f"'{argument}' is not a name that VBA allows")
            if argument.casefold().startswith("ufx") or argument.casefold() == name.casefold():
                raise wrong(f"'{argument}' is a name of the add-in itself")
        if len({n.casefold() for n in names}) < len(names):
            raise wrong("two arguments have one name, upper and lower case being the same")
        if len(record.summary) > LONGEST_TEXT:
            raise wrong(f"the summary is longer than {LONGEST_TEXT} characters")
        for argument in record.arguments:
            if len(argument.description) > LONGEST_TEXT:
                raise wrong(f"the description of {argument.name} is longer than {LONGEST_TEXT} characters")
