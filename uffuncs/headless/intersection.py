"""Implicit intersection: what a formula shows that is no array formula but gives more than one value.

A spreadsheet program takes, of a range where one value is wanted, the cell on the formula's own row or
column, and of any other array the first value. The engine would spill instead.
"""

import re

from .formula import tokens

RANGE = re.compile(
    r"(?:(?:'(?:[^']|'')*'|[^\W\d][\w.]*)!)?"
    r"(?:\$?[A-Za-z]{1,3}\$?[0-9]{1,7}:\$?[A-Za-z]{1,3}\$?[0-9]{1,7}"
    r"|\$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}|\$?[0-9]{1,7}:\$?[0-9]{1,7})(?![\w(.!])"
)

#: Functions that take one value for each argument, so that a range among them is intersected.
SCALAR_FUNCTIONS = frozenset("""
    ABS ACOS ACOSH ASIN ASINH ATAN ATAN2 ATANH BASE BITAND CEILING CHAR CLEAN CODE COMBIN CONCATENATE
    CONVERT COS COSH DATE DATEVALUE DAY DEGREES DELTA EDATE EOMONTH ERF ERFC EVEN EXACT EXP FACT FIND
    FIXED FLOOR GAMMA GAMMALN GESTEP HOUR IF IFERROR IFNA INT ISBLANK ISERR ISERROR ISEVEN ISLOGICAL ISNA
    ISNONTEXT ISNUMBER ISODD ISTEXT LEFT LEN LN LOG LOG10 LOWER MID MINUTE MOD MONTH MROUND NORM.S.DIST
    NORM.S.INV NORMSDIST NORMSINV NOT ODD POWER PROPER QUOTIENT RADIANS REPLACE REPT RIGHT ROUND ROUNDDOWN
    ROUNDUP SEARCH SECOND SIGN SIN SINH SQRT SQRTPI SUBSTITUTE TAN TANH TEXT TIME TIMEVALUE TRIM TRUNC
    UNICHAR UNICODE UPPER VALUE WEEKDAY WEEKNUM YEAR
    """.split())


def intersected(formula, area_names=frozenset()):
    """The formula with @ before each range that stands where one value is wanted."""
    out, stack, scalar = [], [], True
    parts = list(tokens(formula))
    position, skip_to = 0, 0
    previous = ""
    for index, (kind, text) in enumerate(parts):
        start, position = position, position + len(text)
        if start < skip_to:
            continue
        if text in "({":
            stack.append(scalar)
            if text == "{":
                scalar = False
            elif previous and parts[index - 1][0] == "name":
                scalar = scalar and previous.upper().removeprefix("_XLFN.") in SCALAR_FUNCTIONS
        elif text in ")}":
            scalar = stack.pop() if stack else True
        elif (
            scalar
            and (kind in ("name", "quoted", "number") or text == "$")
            and previous not in ("@", "!", ":", "$")
        ):
            match = RANGE.match(formula, start)
            if match or (
                kind == "name" and text.casefold() in area_names and not formula.startswith("(", position)
            ):
                text = match[0] if match else text
                skip_to = start + len(text)
                out.append("@" + text)
                previous = text
                continue
        out.append(text)
        if kind != "space":
            previous = text
    return "".join(out)
