"""Stands in for winreg: keys as dictionaries of name to (data, type), upper and lower case being the same."""

from __future__ import annotations

import contextlib
from types import ModuleType

REG_SZ, REG_BINARY, REG_DWORD = 1, 3, 4


class Key:
    def __init__(self, module, path):
        self.module, self.path = module, path

    def __enter__(self):
        return self

    def __exit__(self, *given):
        self.Close()

    def Close(self):
        pass

    @property
    def values(self):
        return self.module.keys[self.path]


class Registry(ModuleType):
    """`keys` maps a path below HKEY_CURRENT_USER to its values."""

    HKEY_CURRENT_USER, KEY_READ, KEY_ALL_ACCESS = "HKCU", 1, 2

    def __init__(self, keys):
        super().__init__("winreg")
        self.keys = {path: dict(values) for path, values in keys.items()}
        self.writes = []

    def _find(self, path):
        return next((p for p in self.keys if p.casefold() == path.casefold()), None)

    def OpenKey(self, root, path, reserved=0, access=KEY_READ):
        assert root == "HKCU"
        found = self._find(path)
        if found is None:
            if not any(p.casefold().startswith(path.casefold() + "\\") for p in self.keys):
                raise FileNotFoundError(2, "no such key", path)
            self.keys[path], found = {}, path
        key = Key(self, found)
        key.writable = access == self.KEY_ALL_ACCESS
        return key

    def EnumKey(self, key, n):
        below = {}
        for path in self.keys:
            if path.casefold().startswith(key.path.casefold() + "\\"):
                below.setdefault(path[len(key.path) + 1 :].split("\\")[0])
        with contextlib.suppress(IndexError):
            return list(below)[n]
        raise OSError(259, "no more")

    def EnumValue(self, key, n):
        with contextlib.suppress(IndexError):
            name, (data, kind) = list(key.values.items())[n]
            return name, data, kind
        raise OSError(259, "no more")

    def SetValueEx(self, key, name, reserved, kind, data):
        assert key.writable
        self.writes.append(("set", name))
        name = next((n for n in key.values if n.casefold() == name.casefold()), name)
        key.values[name] = (data, kind)

    def DeleteValue(self, key, name):
        assert key.writable
        self.writes.append(("delete", name))
        del key.values[name]
