"""Files are written under a temporary name beside their target and moved into place: never half a file."""

from __future__ import annotations

import os
import stat
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import BinaryIO


def write_into_place(target: Path, write: Callable[[BinaryIO], object]) -> None:
    """Call write(stream) on a temporary file, then move it into place in one step; an old file stays if that fails.

    Raises
    ------
    OSError
        The folder cannot be written, or the target is held by another program.
    """
    mode = stat.S_IMODE(target.stat().st_mode) if target.exists() else 0o666 & ~_umask()
    handle, temporary = tempfile.mkstemp(prefix=".uffuncs-", suffix=".tmp", dir=target.parent)
    try:
        with os.fdopen(handle, "wb") as stream:
            write(stream)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(temporary, mode)
        os.replace(temporary, target)
    finally:
        if os.path.exists(temporary):
            os.unlink(temporary)


def write_whole(path: Path, content: bytes) -> None:
    """Write bytes into place, making the folder if it is not there."""
    path.parent.mkdir(parents=True, exist_ok=True)
    write_into_place(path, lambda stream: stream.write(content))


def _umask() -> int:
    current = os.umask(0)
    os.umask(current)
    return current
