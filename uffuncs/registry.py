"""All worksheet functions: importing the topic modules fills the registry."""

from __future__ import annotations

from importlib import import_module

from .declaration import DECLARED, Function, Tool

#: Topics in the order of the reference, and the modules that hold them; one file is one topic, or a part of one.
TOPICS = {
    "water": ("physics.water",),
    "solution": ("physics.solution",),
    "osmotic": ("physics.osmotic",),
    "permeation": ("physics.permeation",),
    "rejection": ("physics.rejection", "physics.sieving_curve"),
    "crossflow": ("physics.crossflow", "physics.crossflow_transfer", "physics.crossflow_pressure", "physics.module_profile"),
    "polarization": ("physics.polarization", "physics.osmotic_flux"),
    "fouling": ("physics.fouling",),
    "concentration": ("physics.concentration", "physics.batch", "physics.diafiltration", "physics.campaign"),
    "plant": ("physics.plant", "physics.stages", "physics.cycles"),
    "energy": ("physics.energy",),
    "integrity": ("physics.integrity",),
    "tools": ("tools.about", "tools.conversion", "tools.solving", "tools.uncertainty", "tools.claims"),
}


_loaded: dict[str, Function | Tool] = {}


def functions() -> dict[str, Function | Tool]:
    """Worksheet name to record, in the order of the topics."""
    if not _loaded:
        for module in (m for modules in TOPICS.values() for m in modules):
            import_module(f"uffuncs.{module}")
        order = list(TOPICS)
        _loaded.update(sorted(DECLARED.items(), key=lambda item: order.index(item[1].topic)))
    return _loaded


def find(name: str) -> Function | Tool | None:
    """The record of a worksheet function, its name in any case; None if there is none."""
    return functions().get(name) or functions().get(name.strip().upper())


def near_names(name: str, known: list[str] | None = None) -> list[str]:
    """Up to three known names that look like a mistyped one."""
    from difflib import get_close_matches

    return get_close_matches(name.strip().upper(), known or list(functions()), n=3, cutoff=0.6)
