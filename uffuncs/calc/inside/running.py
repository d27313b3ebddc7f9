"""Where the functions run: in this process where its Python fits the user's, else in a worker process."""

import ctypes
import os
import site
import struct
import sys
import threading
import time

from .configuration import AUTOMATIC, IN_PROCESS, WORKER, Problem, note_problem, read_configuration
from .values import error_block
from .watchdog import Watchdog
from .worker_link import SHORTEST_LIMIT, Worker

#: Seconds for which a problem is taken as unsolved: ten thousand cells must not each try again.
RETRY = 5.0
STALE = "the add-in was built from another version of uffuncs; run: uffuncs install calc"


def abi():
    """Which compiled packages this Python can load, such as "cpython-311-64"."""
    return "%s%s-%d" % (sys.implementation.cache_tag, getattr(sys, "abiflags", ""), 8 * struct.calcsize("P"))


class Runner:
    """Calls functions by their worksheet names, and turns whatever goes wrong into an error value."""

    def __init__(self, signatures):
        self.signatures = signatures
        self.target = None
        self.problem = ""
        self.until = 0.0

    def call(self, name, cells):
        """The result as Calc takes it: a tuple of rows of floats and texts."""
        try:
            target = self.target or self._reached()
            if target.stale and name in target.stale:
                return self._failed(name, STALE)
            return target.call(name, cells)
        except Problem as problem:
            self.target, self.until = None, time.monotonic() + RETRY
            return self._failed(name, str(problem))
        except BaseException:  # nothing may get out into the program
            return error_block("#VALUE!")

    def _reached(self):
        if time.monotonic() < self.until:
            raise Problem(self.problem)
        configuration = read_configuration()
        mode = configuration.get("mode", AUTOMATIC)
        if mode == IN_PROCESS or mode != WORKER and fits(configuration):
            try:
                self.target = InProcess(configuration, self.signatures)
            except Exception as error:  # a package that does not load here may load in its own Python
                if mode == IN_PROCESS:
                    raise Problem(
                        "uffuncs does not load inside the program (%s)" % _one_line(error)
                    ) from None
        if self.target is None:
            self.target = Worker(configuration, self.signatures)
        self.problem = ""
        return self.target

    def _failed(self, name, text):
        if text != self.problem:
            note_problem(text)
        self.problem = text
        if name == "UF_WHY":
            return (("uffuncs: " + text,),)
        return error_block("#NAME?")


def fits(configuration):
    """Whether the user's packages can be loaded here, and no other NumPy is loaded already."""
    if configuration.get("abi") != abi():
        return False
    numpy = sys.modules.get("numpy")
    loaded = os.path.realpath(getattr(numpy, "__file__", None) or "")
    return numpy is None or any(
        loaded.startswith(os.path.join(os.path.realpath(p), "")) for p in configuration["paths"]
    )


def _one_line(error):
    return " ".join(("%s: %s" % (type(error).__name__, error)).split())[:200]


class TimeIsOver(BaseException):
    """Set upon the thread of a call that hangs."""


class InProcess:
    """Calls functions in this process."""

    def __init__(self, configuration, signatures):
        add_paths(configuration["paths"])
        from uffuncs.calc import answers

        self.answer = answers.answer
        self.stale = frozenset(answers.stale(signatures))
        self.limit = self.patience = configuration["seconds"]
        self.watchdog = Watchdog()
        self.thread = 0

    def call(self, name, cells):
        self.thread = threading.get_ident()
        self.watchdog.begin(self.patience, self._interrupt)
        try:
            result = self.answer(name, cells)
            self.patience = self.limit
        except TimeIsOver:
            self.patience = max(SHORTEST_LIMIT, self.patience / 2)
            result = error_block("#NUM!")
        finally:
            if self.watchdog.end():
                _raise_in(self.thread, None)  # an interruption that comes too late must not hit the program
        return result

    def _interrupt(self):
        _raise_in(self.thread, TimeIsOver)


def _raise_in(thread, exception):
    ctypes.pythonapi.PyThreadState_SetAsyncExc(
        ctypes.c_ulong(thread), None if exception is None else ctypes.py_object(exception)
    )


def add_paths(paths):
    """The user's packages come first: the program's own Python may hold an older NumPy."""
    before = list(sys.path)
    for path in paths:
        site.addsitedir(path)
    added = [p for p in sys.path if p not in before]
    sys.path[:] = added + before
