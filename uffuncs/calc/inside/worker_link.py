"""The add-in's end of the pipes to its worker, a process of the user's own Python."""

import os
import subprocess
import threading

from .configuration import Problem
from .frames import TooLong, packed, tuple_block, unpacked
from .values import error_block, trimmed
from .watchdog import Watchdog

START_LIMIT = 60.0  # seconds for loading NumPy on a slow disk
SHORTEST_LIMIT = 1.0
#: What the program's own Python and libraries need, and would break another Python.
FOREIGN = (
    "PYTHONPATH",
    "PYTHONHOME",
    "PYTHONEXECUTABLE",
    "LD_LIBRARY_PATH",
    "DYLD_LIBRARY_PATH",
    "__PYVENV_LAUNCHER__",
)
NO_WINDOW = 0x08000000

PROGRAM = """\
import sys
sys.path[:] = sys.argv[1:] + [p for p in sys.path if p not in ("", *sys.argv[1:])]
from uffuncs.calc.worker import main
main()
"""


class Worker:
    """Calls functions in a worker process, which is started again once when it dies during a call."""

    def __init__(self, configuration, signatures):
        self.configuration = configuration
        self.signatures = signatures
        self.limit = configuration["seconds"]
        self.patience = (
            self.limit
        )  # shrinks while calls hang, so that a sheet of them does not freeze the program
        self.process = None
        self.lock = threading.Lock()
        self.watchdog = Watchdog()
        self.stale = frozenset()
        with self.lock:
            self._start()

    def call(self, name, cells):
        try:
            message = packed([name, *trimmed(cells)])
        except TooLong:
            return error_block("#VALUE!")
        with self.lock:
            for _ in range(2):
                if self.process is None or self.process.poll() is not None:
                    self.stop()
                    self._start()
                outcome, values = self._exchange(message, self.patience)
                if outcome == "answered":
                    self.patience = self.limit
                    return values[0]
                self.stop()
                if outcome == "hung":
                    self.patience = max(SHORTEST_LIMIT, self.patience / 2)
                    return error_block("#NUM!")
        return error_block("#VALUE!")

    def _exchange(self, message, seconds):
        """("answered", values), or "died" or "hung" and None."""
        process, values = self.process, None
        self.watchdog.begin(seconds, process.kill)
        try:
            send(process.stdin.fileno(), message)
            values, _ = unpacked(self._receive, tuple_block)
        except (OSError, EOFError, ValueError):
            pass
        finally:
            fired = self.watchdog.end()
        if values is not None and not fired:
            return "answered", values
        return ("hung" if fired else "died"), None

    def _receive(self, count):
        return receive(self.process.stdout.fileno(), count)

    def _start(self):
        python = self.configuration["python"]
        environment = {k: v for k, v in os.environ.items() if k not in FOREIGN}
        try:
            self.process = subprocess.Popen(
                [python, "-u", "-c", PROGRAM, *self.configuration["paths"]],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=subprocess.PIPE,
                bufsize=0,
                env=environment,
                cwd=os.path.dirname(python) or None,
                creationflags=NO_WINDOW if os.name == "nt" else 0,
            )
        except OSError as error:
            self.process = None
            raise Problem(
                "the Python %s cannot be started (%s); run: uffuncs install calc"
                % (python, error.strerror or error)
            ) from None
        outcome, values = self._exchange(packed([], signatures=self.signatures), START_LIMIT)
        if outcome != "answered":
            complaint = self._complaint()
            self.stop()
            raise Problem(
                "the Python %s does not run uffuncs (%s); run: uffuncs install calc" % (python, complaint)
            )
        self.stale = frozenset(values)
        self.process.stderr.close()

    def _complaint(self):
        """The last line that a worker which did not start has written."""
        self.process.kill()
        lines = self.process.stderr.read(65536).decode("utf-8", "replace").strip().splitlines()
        return lines[-1][:200] if lines else "it ended without a word"

    def stop(self):
        """End the worker and leave nothing behind."""
        process, self.process = self.process, None
        if process is None:
            return
        process.kill()
        for pipe in (process.stdin, process.stdout, process.stderr):
            try:
                pipe.close()
            except OSError:
                pass
        process.wait()


def receive(file, count):
    """Exactly `count` bytes of a pipe.

    Raises
    ------
    EOFError
        The other end is closed.
    """
    piece = os.read(file, count)
    if len(piece) == count:
        return piece
    pieces = []
    while True:
        if not piece:
            raise EOFError
        pieces.append(piece)
        count -= len(piece)
        if not count:
            return b"".join(pieces)
        piece = os.read(file, min(count, 1 << 20))


def send(file, message):
    rest = memoryview(message)
    while rest:
        rest = rest[os.write(file, rest) :]
