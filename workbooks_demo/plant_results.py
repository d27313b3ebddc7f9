"""The later sheets of plant_design.xlsx: energy and cost, questions a reviewer asks, key results, notes."""

from __future__ import annotations

from dataclasses import dataclass

from openpyxl import Workbook
from openpyxl.styles import Alignment

from uffuncs.cell import call

from .layout import Page


@dataclass(frozen=True)
class ResultTable:
    """Where the key results stand: label, value, unit in three neighbouring columns."""

    sheet: str
    first_row: int
    last_row: int
    column: int


SUMMARY = ResultTable("Summary", 5, 17, 1)


def energy_and_cost(workbook: Workbook) -> None:
    page = Page(workbook, "Energy and cost", "Energy and cost", "Pumps in service, membranes, capital and the rest, per m³ of permeate.")
    page.section("Power in service")
    page.calculated("Feed pump", "P", "=UF_PUMP_POWER(feed_flow,inlet_pressure,efficiency)", "kW", "", "feed_power", "0.00")
    page.calculated("Recirculation pumps, all stages", "P", "=UF_PUMP_POWER(total_loop_flow,vessel_loss,efficiency)", "kW",
                    "loss in pipes and valves comes on top", "loop_power", "0.00")
    page.calculated("Temperature rise of one pass of a loop", "ΔT", "=UF_TEMPERATURE_RISE(loop_power,total_loop_flow,mean_density)",
                    "°C difference", "the loops heat up: cool them, or let the feed in colder", "", "0.000")
    page.output("Specific energy", "E", "=UF_ENERGY_SPECIFIC(feed_power+loop_power,total_permeate)", "kWh/m³", "", "specific_energy", "0.00")
    page.check("One formula gives the same?",
               '=IF(ABS(specific_energy-UF_ENERGY_CROSSFLOW(feed_flow,inlet_pressure,total_loop_flow,vessel_loss,total_permeate,'
               'efficiency))<0.000001,"ok","differs")')
    page.section("Cost per m³ of permeate")
    page.calculated("Permeate in a year", "V_a", "=total_permeate*24*availability*production_days", "m³/year", "", "annual_permeate", "#,##0")
    page.calculated("Membrane replacement", "", "=UF_COST_MEMBRANE(installed_area,membrane_price,membrane_life,annual_permeate,"
                    "interest_rate)", "money/m³", "", "membrane_cost", "0.000")
    page.calculated("Energy", "", "=specific_energy*energy_price", "money/m³", "", "energy_cost", "0.000")
    page.calculated("Capital outlay", "", "=capital_per_area*installed_area", "money", "", "capital", "#,##0")
    page.output("All together", "", "=UF_COST_TREATMENT(capital,interest_rate,plant_life,specific_energy,energy_price,membrane_cost,"
                "other_cost,annual_permeate)", "money/m³", "", "treatment_cost", "0.00")
    page.section("Cleaning")
    page.calculated("Cleanings in a year", "", "=production_days*24/(cleaning_interval+cleaning_duration)", "1/year", "", "cleanings", "0")
    page.input("Free chlorine in the alkaline wash", "", 0.15, "g/L", "only where the membrane maker allows it", "chlorine")
    page.input("Contact time", "", 0.5, "h", "", "chlorine_time")
    page.calculated("Exposure in a year", "", "=UF_CHEMICAL_EXPOSURE(chlorine,chlorine_time,cleanings)", "g·h/(L·year)",
                    "compare with the maker's lifetime limit", "", "0.0")


def questions(workbook: Workbook) -> None:
    page = Page(workbook, "Questions", "Questions a reviewer asks", "Live cells instead of Goal Seek, a spread instead of a bare number, "
                "claims against calculated values.", {"C": 28})
    osmotic = "permeability,transfer_coefficient,mean_concentration,osmotic_1,osmotic_2,osmotic_3,intrinsic_rejection"
    page.section("Which pressure gives the flux wanted?")
    page.input("Flux wanted", "J", "60 gfd", "L/(m²·h)", "at the mean concentration", "wanted_flux")
    page.output("Transmembrane pressure", "Δp_tm", f'=UF_SOLVE_FOR("UF_FLUX_OSMOTIC","transmembrane_pressure",wanted_flux,,{osmotic})',
                "bar", "solved within the bounds of the argument", "wanted_pressure", "0.000")
    page.check("The flux comes back?", f'=IF(ABS(UF_FLUX_OSMOTIC(wanted_pressure,{osmotic})-UF_CONVERT(60,"gfd","LMH"))<0.0000001,"ok","differs")')
    page.section("How far do the uncertainties spread the flux, and the area?")
    page.calculated("Pressure", "Δp_tm", '=UF_QUANTITY(ROUND(operating_pressure,3),"bar",0.1)', "", "two gauges of 0.07 bar each", "uncertain_pressure",
                    "General")
    page.calculated("Permeability, fouled", "L_p", '=UF_QUANTITY(ROUND(permeability,2),"L/(m²·h·bar)",ROUND(0.08*permeability,2))', "",
                    "8 %, cleaning to cleaning", "uncertain_permeability", "General")
    page.calculated("Mass-transfer coefficient", "k", '=UF_QUANTITY(ROUND(transfer_coefficient,2),"L/(m²·h)",ROUND(0.15*transfer_coefficient,2))', "",
                    "15 %, the scatter of the correlation", "uncertain_k", "General")
    first = page.row
    for label, unit in (("Flux: mean", "L/(m²·h)"), ("Standard uncertainty", "L/(m²·h)"), ("2.5 % point", "L/(m²·h)"), ("97.5 % point", "L/(m²·h)"),
                        ("Share of the variance: pressure", "-"), ("Share of the variance: permeability", "-"),
                        ("Share of the variance: mass-transfer coefficient", "-")):
        page.calculated(label, "", None, unit)
    page.array(f"C{first}", f"C{page.row - 1}", '=TRANSPOSE(UF_UNCERTAINTY("UF_FLUX_OSMOTIC",uncertain_pressure,uncertain_permeability,uncertain_k,'
               "mean_concentration,osmotic_1,osmotic_2,osmotic_3,intrinsic_rejection))", "0.00")
    for row in range(first + 4, page.row):
        page.sheet[f"C{row}"].number_format = "0 %"
    page.calculated("Mean flux of the cascade, with the same relative spread", "J", f'=UF_QUANTITY(ROUND(mean_flux,2),"L/(m²·h)",'
                    f"ROUND(mean_flux*C{first + 1}/C{first},2))", "", "", "uncertain_flux", "General")
    first = page.row
    for label in ("Area: mean", "Standard uncertainty", "2.5 % point", "97.5 % point"):
        page.calculated(label, "A" if label == "Area: mean" else "", None, "m²")
    page.array(f"C{first}", f"C{page.row - 1}", '=TRANSPOSE(UF_UNCERTAINTY("UF_AREA",total_permeate,uncertain_flux))', "0.0")
    page.text("The arguments count as independent. k and C_g of one fit are not: a high k goes with a low C_g, and to spread them apart would "
              "show too much.", "Explanatory Text")
    page.section("Do a bidder's numbers hold?")
    for label, claimed, calculated, sense, unit in (
        ("Mean flux of the cascade, claimed", "75 gfd", "mean_flux", "at most", "L/(m²·h)"),
        ("Membrane area installed, claimed", 210, "installed_area", "at least", "m²"),
        ("Specific energy, claimed", 0.25, "specific_energy", "equal", "kWh/m³"),
    ):
        cell = page.input(label, "", claimed, unit, "invented bid")
        page.calculated("  verdict", "", f'=UF_CLAIM({cell},{calculated},0.15,"{sense}","{unit}")', "", f"{sense} the calculated value, 15 %", "", "General")


def key_results(page: Page) -> None:
    """The sheet that `uffuncs demo` prints."""
    page.sheet.column_dimensions["B"].width = 16
    page.sheet.column_dimensions["C"].width = 18
    page.sheet.column_dimensions["E"].width = 30
    page.row = SUMMARY.first_row - 1
    for column, text in (("A", "Result"), ("B", "Value"), ("C", "Unit")):
        page.sheet[f"{column}{page.row}"] = text
        page.sheet[f"{column}{page.row}"].style = "Headline 3"
        page.sheet[f"{column}{page.row}"].alignment = Alignment(horizontal={"A": "left", "B": "right", "C": "left"}[column], indent=int(column == "C"))
    rows = (
        ("Feed flow in service", "=feed_flow", "m³/h", "#,##0.0"),
        ("Mass-transfer coefficient", "=transfer_coefficient", "L/(m²·h)", "0.0"),
        ("Gel concentration from the trial", "=trial_gel", "g/L", "0"),
        ("Transmembrane pressure", "=operating_pressure", "bar", "0.00"),
        ("Flux at the mean concentration", "=operating_flux", "L/(m²·h)", "0.0"),
        ("Polarization modulus there", "=modulus", "-", "0.00"),
        ("Membrane area needed", "=total_area", "m²", "#,##0"),
        ("Mean flux of the cascade", "=mean_flux", "L/(m²·h)", "0.0"),
        ("Modules installed", "=total_modules", "-", "#,##0"),
        ("Recovery", "=recovery", "-", "0.000"),
        ("Protein kept in the retentate", "=cascade_yield", "-", "0.0000"),
        ("Specific energy", "=specific_energy", "kWh/m³", "0.00"),
        ("Cost per m³ of permeate", "=treatment_cost", "money/m³", "0.00"),
    )
    assert len(rows) == SUMMARY.last_row - SUMMARY.first_row + 1
    for row, (label, formula, unit, number_format) in enumerate(rows, SUMMARY.first_row):
        page.sheet[f"A{row}"], page.sheet[f"B{row}"], page.sheet[f"C{row}"] = label, formula, unit
        page.sheet[f"B{row}"].style, page.sheet[f"B{row}"].number_format = "Output", number_format
        page.sheet[f"C{row}"].alignment = Alignment(horizontal="left", indent=1)


def notes(workbook: Workbook) -> None:
    page = Page(workbook, "Notes", "Purpose, cautions, sources", "Read before use.")
    page.section("Purpose")
    page.text("A worked design of an invented ultrafiltration plant, from design basis to area, modules, energy and cost. It shows how the "
              "UF_ functions are used together; copy the formulas, not the numbers.")
    page.text("Cells: an orange field is an input, orange figures a calculation, black figures in grey a result, a dark field a check. Units stand in their own column; every "
              "UF_ function takes and gives the unit shown. =UF_WHY(\"UF_FLUX_DARCY\",…) tells why a cell shows an error.")
    page.section("What is simplified")
    page.text("One operating pressure and one loss per module for all stages; the permeate is taken as water; the rejection is that of the "
              "mean concentration; fouling is a fixed ratio. A trial on the real feed decides.")
    page.section("Cautions")
    page.text("An aid to calculation. Local codes, the membrane maker's limits on pressure, temperature, pH and chlorine, and licensed "
              "practice decide.", "Warning Text")
    page.text("Pressure: relief devices and vessel ratings come before any number here. Cleaning chemicals burn: wear protection, follow the "
              "supplier's sheet.", "Warning Text")
    page.text("Never mix hypochlorite with acid cleaners: chlorine gas. Rinse fully between alkaline chlorine and acid steps.", "Warning Text")
    page.section("Sources")
    for name in ("UF_WATER_VISCOSITY", "UF_DIFFUSION_YOUNG", "UF_VISCOSITY_ROSS_MINTON", "UF_OSMOTIC_POLYNOMIAL", "UF_SHERWOOD_SPACER",
                 "UF_PRESSURE_DROP_SPACER", "UF_FLUX_OSMOTIC", "UF_GEL_FIT", "UF_STAGES_TABLE", "UF_COST_TREATMENT", "UF_UNCERTAINTY"):
        page.sheet[f"A{page.row}"] = name
        page.sheet.merge_cells(f"B{page.row}:E{page.row}")
        cell = page.sheet[f"B{page.row}"]
        cell.value, cell.alignment = f'=UF_SOURCE("{name}")', Alignment(wrap_text=True, vertical="top")
        page.sheet[f"A{page.row}"].alignment = Alignment(vertical="top")
        page.sheet.row_dimensions[page.row].height = 15 * (1 + len(call("UF_SOURCE", [name])) // 95)
        page.row += 1
