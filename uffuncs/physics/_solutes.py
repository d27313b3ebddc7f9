"""The table of published solute properties, `solutes.csv`, read once and only when it is asked for."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from ..errors import NotAvailable
from ..units import worksheet_unit

#: property in the table -> its entry in the vocabulary
PROPERTIES = {
    "molar_mass": "molar_mass",
    "radius": "solute_radius",
    "diffusion_coefficient": "diffusion_coefficient",
    "partial_specific_volume": "partial_specific_volume",
    "intrinsic_viscosity": "intrinsic_viscosity",
    "gel_concentration": "gel_concentration",
    "osmotic_coefficient_1": "first_coefficient",
    "osmotic_coefficient_2": "second_coefficient",
    "osmotic_coefficient_3": "third_coefficient",
}
#: a condition of a property, asked for like a property -> (that property, field of its entry, vocabulary)
CONDITIONS = {
    "diffusion_temperature": ("diffusion_coefficient", "temperature", "temperature"),
    "osmotic_temperature": ("osmotic_coefficient_1", "temperature", "temperature"),
    "osmotic_lowest_concentration": ("osmotic_coefficient_1", "lowest", "concentration"),
    "osmotic_highest_concentration": ("osmotic_coefficient_1", "highest", "concentration"),
}

_CONDITION_COLUMNS = ("temperature_celsius", "lowest_concentration", "highest_concentration")  # °C, g/L, g/L


#: Characters of an origin, so that UF_WHY shows it whole.
MOST_SHOWN = 230


@dataclass(frozen=True)
class Entry:
    """One published property of one solute, in SI; conditions that do not apply are None."""

    value: float
    temperature: float | None
    lowest: float | None
    highest: float | None
    note: str
    source: str

    @property
    def origin(self) -> str:
        """Where the value comes from; of the note as many clauses as a cell's note has room for."""
        at = f"at {self.temperature - 273.15:.6g} °C" if self.temperature is not None else ""
        text = "; ".join(filter(None, [at, self.source]))
        for clause in filter(None, self.note.split("; ")):
            if len(text) + len(clause) > MOST_SHOWN:
                break
            text = f"{text}; {clause}"
        return text


@lru_cache(maxsize=1)
def solute_table() -> dict[str, dict[str, Entry]]:
    """Solute to property to entry."""
    import csv

    table: dict[str, dict[str, Entry]] = {}
    with Path(__file__).with_name("solutes.csv").open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            _, scale, offset = worksheet_unit(row["unit"])
            celsius, lowest, highest = (float(row[c]) if row[c] else None for c in _CONDITION_COLUMNS)
            table.setdefault(row["name"], {})[row["property"]] = Entry(
                scale * float(row["value"]) + offset,
                None if celsius is None else celsius + 273.15,
                lowest,
                highest,
                row["note"],
                row["source"],
            )
    return table


def properties_of(solute: str) -> dict[str, Entry]:
    """The properties that the table has of a solute; its name in any case.

    Raises
    ------
    NotAvailable
        No such solute; names those that look like it, else those there are.
    """
    table = solute_table()
    name = " ".join(solute.casefold().split())
    if name in table:
        return table[name]
    from difflib import get_close_matches

    near = get_close_matches(name, table, n=3, cutoff=0.5)
    near = near or [known for known in table if len(name) > 2 and name in known]
    hint = f"is it {' or '.join(near)}?" if near else f"there are: {', '.join(table)}"
    raise NotAvailable(f"the table has no solute '{solute[:40]}'; {hint}")


def entry_of(solute: str, property_name: str) -> Entry:
    """One entry of the table.

    Raises
    ------
    NotAvailable
        No such solute, or none of its properties is the one asked for.
    """
    properties = properties_of(solute)
    if property_name not in properties:
        there = ", ".join(properties)
        raise NotAvailable(f"the table has no {property_name} of {solute[:40]}; it has: {there}")
    return properties[property_name]


def osmotic_fit(solute: str) -> tuple[float, float, float]:
    """The three coefficients of a solute's published osmotic pressure."""
    first = entry_of(solute, "osmotic_coefficient_1").value
    return first, *(entry_of(solute, f"osmotic_coefficient_{n}").value for n in (2, 3))
