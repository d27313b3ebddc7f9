"""Functions registered with the engine beside the uffuncs functions: helpers, and natives it may lack."""

import math

from .adapter import OUTGOING

NOT_AVAILABLE = OUTGOING["#N/A"]
NOT_A_NUMBER = OUTGOING["#NUM!"]
WRONG_VALUE = OUTGOING["#VALUE!"]

FIT = "UF__FIT"


def omitted():
    """Stands for an omitted argument: the engine would pass 0."""
    return None


def fit(value, rows, columns, skip=0.0, count=None):
    """A result spread over the range of an array formula: single rows and columns repeat, gaps are #N/A.

    `skip` and `count` choose a block of rows, for ranges larger than the engine spills at once.
    """
    rows, columns, skip = int(rows), int(columns), int(skip)
    block = value if isinstance(value, list) else [[value]]
    height, width = len(block), len(block[0]) if block else 0
    out = []
    for i in range(skip, min(rows, skip + int(count)) if count is not None else rows):
        source = block[0] if height == 1 else block[i] if i < height else None
        if source is None:
            out.append([NOT_AVAILABLE] * columns)
        elif width == 1:
            out.append([_shown(source[0])] * columns)
        else:
            out.append([_shown(source[j]) if j < width else NOT_AVAILABLE for j in range(columns)])
    return out


def _shown(value):
    return 0.0 if value is None else value  # an array formula shows a blank as 0


def _matrix(value):
    """Numbers of a range as an array, or the error a spreadsheet program gives for it."""
    import numpy as np

    rows = value if isinstance(value, list) else [[value]]
    for row in rows:
        for item in row:
            if type(item) is dict:
                return item
            if type(item) is bool or not isinstance(item, (int, float)):
                return WRONG_VALUE
    return np.array(rows, dtype=float)


def _block(array):
    return [[item if math.isfinite(item) else NOT_A_NUMBER for item in row] for row in array.tolist()]


def matrix_product(first, second):
    """MMULT."""
    import numpy as np

    a, b = _matrix(first), _matrix(second)
    for operand in (a, b):
        if isinstance(operand, dict):
            return operand
    if a.shape[1] != b.shape[0]:
        return WRONG_VALUE
    with np.errstate(all="ignore"):
        return _block(a @ b)


def matrix_inverse(value):
    """MINVERSE."""
    import numpy as np

    a = _matrix(value)
    if isinstance(a, dict):
        return a
    if a.shape[0] != a.shape[1]:
        return WRONG_VALUE
    try:
        with np.errstate(all="ignore"):
            return _block(np.linalg.inv(a))
    except np.linalg.LinAlgError:
        return NOT_A_NUMBER


def matrix_determinant(value):
    """MDETERM."""
    import numpy as np

    a = _matrix(value)
    if isinstance(a, dict):
        return a
    if a.shape[0] != a.shape[1]:
        return WRONG_VALUE
    with np.errstate(all="ignore"):
        result = float(np.linalg.det(a))
    return result if math.isfinite(result) else NOT_A_NUMBER


NATIVES = {"MMULT": (matrix_product, 2), "MINVERSE": (matrix_inverse, 1), "MDETERM": (matrix_determinant, 1)}
