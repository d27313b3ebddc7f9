"""Gives up calls that take too long: one sleeping thread, which costs a call two attributes."""

import threading
import time

TICK = 0.2
#: Seconds without a call after which the thread sleeps soundly.
QUIET = 5.0


class Watchdog:
    """Runs `stop` of the call under way when its time is over."""

    def __init__(self):
        self.lock = threading.Lock()
        self.deadline = None
        self.stop = None
        self.fired = False
        self.asleep = True
        self.wake = threading.Event()
        self.thread = None

    def begin(self, seconds, stop):
        self.fired = False
        self.stop = stop
        self.deadline = time.monotonic() + seconds
        if self.asleep:
            self._rouse()

    def end(self):
        """Whether the call was given up; afterwards `stop` is not run any more."""
        with self.lock:
            self.deadline = None
            return self.fired

    def _rouse(self):
        self.asleep = False
        self.wake.set()
        if self.thread is None or not self.thread.is_alive():
            self.thread = threading.Thread(target=self._watch, name="uffuncs watchdog", daemon=True)
            self.thread.start()

    def _watch(self):
        quiet_since = time.monotonic()
        while True:
            time.sleep(TICK)
            now = time.monotonic()
            if self.deadline is not None:
                quiet_since = now
                self._look(now)
            elif now - quiet_since > QUIET:
                self.wake.clear()
                self.asleep = True
                if self.deadline is None:
                    self.wake.wait()
                self.asleep = False
                quiet_since = time.monotonic()

    def _look(self, now):
        with self.lock:
            if self.deadline is None or now < self.deadline:
                return
            self.deadline = None
            self.fired = True
            self.stop()
