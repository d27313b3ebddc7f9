"""uffuncs: ultrafiltration engineering functions, in Python and in the cells of a worksheet.

Every worksheet function UF_NAME is the plain function `uffuncs.name`, in SI units:

>>> import uffuncs
>>> f"{uffuncs.flux_darcy(1e5, 1.002e-3, 5e12) * 3.6e6:.2f} L/(m²·h)"
'71.86 L/(m²·h)'
"""

from .version import __version__

__all__ = ["__version__"]


def __getattr__(name: str):
    """Functions are looked up when first used, so that `import uffuncs` loads nothing heavy."""
    from importlib.util import find_spec

    # `from uffuncs import cell` asks here before it imports the module: leave modules to the import system.
    if not name.startswith("_") and find_spec(f"uffuncs.{name}") is None:
        from .declaration import Function
        from .registry import find

        record = find("UF_" + name)
        if isinstance(record, Function) and record.python.__name__ == name:
            globals()[name] = record.python
            return record.python
    raise AttributeError(f"module 'uffuncs' has no attribute '{name}'")


def __dir__():
    from .declaration import Function
    from .registry import functions

    return [*__all__, *(r.python.__name__ for r in functions().values() if isinstance(r, Function))]
