"""What `uffuncs doctor` tells: one sentence, and whether something needs doing."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Finding:
    """One thing looked at, in plain words; `good` is false where something needs doing."""

    text: str
    good: bool = True

    def __str__(self) -> str:
        return self.text
