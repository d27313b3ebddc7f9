"""The worker process: answers calls that come through its standard input, until that is closed."""

from __future__ import annotations

import os
import sys
import threading
import time

#: Seconds between two looks whether the program that started this one is still there.
LOOK = 1.0


def main() -> None:
    """Serve one program. Its end closes the pipe, or leaves this process to another parent."""
    requests, replies = os.dup(0), os.dup(1)
    quiet = os.open(os.devnull, os.O_RDWR)
    os.dup2(quiet, 0)
    os.dup2(quiet, 1)  # a stray print must not end up among the replies
    parent = os.getppid()
    threading.Thread(target=_end_with, args=(parent, requests), daemon=True).start()

    from .answers import answer, stale
    from .inside.frames import TooLong, packed, unpacked
    from .inside.values import error_block
    from .inside.worker_link import receive, send

    def take(count: int) -> bytes:
        return receive(requests, count)

    try:
        _, head = unpacked(take, number_block)
        send(replies, packed(stale(head["signatures"])))
        os.dup2(quiet, 2)  # from here on nobody reads what Python complains of
        while True:
            (name, *cells), _ = unpacked(take, number_block)
            try:
                reply = packed([answer(name, cells)])
            except TooLong:
                reply = packed([error_block("#VALUE!")])
            send(replies, reply)
    except (EOFError, BrokenPipeError):
        pass
    finally:
        sys.stderr = None


def number_block(numbers: memoryview, rows: int, columns: int):
    """A block of raw numbers as an array."""
    import numpy as np

    return np.frombuffer(numbers, np.float64, rows * columns).reshape(rows, columns)


def _end_with(parent: int, requests: int) -> None:
    """End this process with its program, also in the midst of a long call."""
    while True:
        time.sleep(LOOK)
        if os.name == "nt":
            if _pipe_is_broken(requests):
                os._exit(0)
        elif os.getppid() != parent:
            os._exit(0)


def _pipe_is_broken(file: int) -> bool:
    """Whether the other end of a Windows pipe is closed."""
    import ctypes
    import msvcrt

    handle = ctypes.c_void_p(msvcrt.get_osfhandle(file))
    return not ctypes.windll.kernel32.PeekNamedPipe(handle, None, 0, None, None, None)
