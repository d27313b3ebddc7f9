"""A stand-in for the library whose UF_VERSION hangs or dies on demand; everything else is the real one."""

from __future__ import annotations

from pathlib import Path

STAND_IN = """
from pkgutil import extend_path

__path__ = extend_path(__path__, __name__)

import os
import time

import uffuncs.cell
from uffuncs.registry import functions


def misbehave(what=""):
    while os.path.exists(DEMAND):
        with open(DEMAND, encoding="utf-8") as file:
            what = file.read()
        if what == "spin":
            pass
        elif what == "sleep":
            time.sleep(0.2)
        elif what == "block":
            time.sleep(3600)
        elif what == "die":
            os._exit(3)
        elif what == "die once":
            os.unlink(DEMAND)
            os._exit(3)
        elif what == "print":
            print("not among the replies", flush=True)
            break
        elif what == "raise":
            raise KeyboardInterrupt
        else:
            return what
    return "well"


DEMAND = %r
object.__setattr__(functions()["UF_VERSION"], "python", misbehave)
"""


class Misbehaving:
    """The stand-in's folder, and what it shall do next."""

    def __init__(self, folder: Path):
        self.demand = folder / "demand"
        self.path = folder / "stand_in"
        (self.path / "uffuncs").mkdir(parents=True)
        (self.path / "uffuncs" / "__init__.py").write_text(STAND_IN % str(self.demand), encoding="utf-8")

    def shall(self, what: str):
        if what:
            self.demand.write_text(what, encoding="utf-8")
        else:
            self.demand.unlink(missing_ok=True)

    def settings(self, **more) -> dict:
        from uffuncs.calc.installation import own_settings

        found = own_settings() | {"seconds": 1.0} | more
        return found | {"paths": [str(self.path), *found["paths"]]}
