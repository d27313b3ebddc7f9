"""Builds plant_design.xlsx: a whey-protein ultrafiltration plant, from design basis to area, modules, energy and cost.

The plant, its data and its prices are invented. Run `python -m workbooks_demo.plant_design` to write the workbook, with its
values, beside this script; `uffuncs demo` writes it anywhere.
"""

from __future__ import annotations

from pathlib import Path

from openpyxl import Workbook
from openpyxl.chart import BarChart, Reference
from openpyxl.formatting.rule import FormulaRule
from openpyxl.styles import PatternFill
from openpyxl.worksheet.datavalidation import DataValidation

from .layout import Page, add_series, column_range, save, scatter, write_with_values
from .plant_results import energy_and_cost, key_results, notes, questions

STAGES = 3
PRESSURES = (0.25, 0.5, 0.75, 1, 1.25, 1.5, 1.75, 2, 2.5, 3, 3.5, 4, 5, 6)
CONCENTRATIONS = (4, 6, 9, 13, 19, 27, 38, 52, 66, 82, 100)
TRIAL = ((8, 168.5), (14, 140.5), (25, 117.2), (42, 91.9), (65, 73.8), (90, 57.6))  # g/L, L/(m²·h); invented


def build(path: Path) -> None:
    """Write the workbook, formulas only."""
    workbook = Workbook()
    workbook.remove(workbook.active)
    summary = Page(workbook, "Summary", "Whey protein ultrafiltration: key results",
                   "An invented plant. Every value below is computed in the sheets that follow; change the inputs there.")
    basis(workbook)
    fluid(workbook)
    trial(workbook)
    transfer(workbook)
    polarization(workbook)
    pressure_curve(workbook)
    concentration_curve(workbook)
    cascade(workbook)
    energy_and_cost(workbook)
    questions(workbook)
    notes(workbook)
    key_results(summary)
    save(workbook, path)


def basis(workbook: Workbook) -> None:
    page = Page(workbook, "Design basis", "Design basis", "Inputs. Orange cells are meant to be changed; a text with a unit, "
                "such as \"45 psi\" or \"122 degF\", works in every one of them.")
    page.section("Duty")
    page.input("Whey to be treated per day", "V_d", 420, "m³/day", "sweet whey, clarified and separated", "daily_volume")
    page.input("Protein in the feed", "C_0", 6.2, "g/L", "true protein", "feed_concentration")
    page.input("Protein in the final retentate", "C_n", 75, "g/L", "", "final_concentration")
    page.input("Process temperature", "T", 50, "°C", "within the membrane maker's limit", "temperature")
    page.input("Intrinsic rejection of protein", "R_i", 0.998, "-", "from the trial", "intrinsic_rejection")
    page.section("Membrane and module")
    page.input("Clean-water flux in the test", "J_cw", 165, "L/(m²·h)", "new membrane", "clean_water_flux")
    page.input("Pressure of the test", "Δp_tm", "29 psi", "bar", "typed with its unit, as on the test sheet", "clean_water_pressure")
    page.input("Water temperature of the test", "T", 25, "°C", "", "clean_water_temperature")
    page.input("Fouling resistance over membrane resistance", "R_f/R_m", 1.4, "-", "after 8 h, from the trial", "fouling_ratio")
    page.input("Membrane area of one module", "A_m", 16, "m²", "spiral-wound", "module_area")
    page.input("Length of the feed channel", "L", 0.9, "m", "", "channel_length")
    page.input("Height of the feed channel", "h", 0.8, "mm", "", "channel_height")
    page.input("Filament diameter of the spacer", "d_f", 0.4, "mm", "", "filament_diameter")
    page.input("Voidage of the spacer", "ε", 0.86, "-", "", "spacer_voidage")
    page.input("Modules in series in one vessel", "n", 2, "-", "", "modules_in_series")
    page.section("Operation")
    page.input("Velocity in the feed channel", "u", 0.25, "m/s", "between the filaments", "velocity")
    page.input("Pressure at the inlet of a loop", "p_f", 3.8, "bar", "gauge", "inlet_pressure")
    page.input("Pressure of the permeate", "p_p", 0.2, "bar", "gauge", "permeate_pressure")
    page.input("Time in service between cleanings", "t_i", 18, "h", "", "cleaning_interval")
    page.input("Time of one cleaning", "t_c", 3.5, "h", "rinse, caustic, rinse, acid, rinse", "cleaning_duration")
    page.input("Spare area", "", "5 %", "-", "", "spare_fraction")
    efficiency = page.input("Efficiency of pump and motor", "η", 0.62, "-", "", "efficiency")
    page.section("Money (any one currency)")
    page.input("Capital outlay per membrane area", "", 900, "money/m²", "skids, pumps, tanks, controls", "capital_per_area")
    page.input("Membrane price", "", 85, "money/m²", "", "membrane_price")
    page.input("Membrane life", "", 2, "year", "", "membrane_life")
    page.input("Price of energy", "", 0.14, "money/kWh", "", "energy_price")
    page.input("Labour, chemicals, maintenance", "", 95000, "money/year", "", "other_cost")
    page.input("Interest rate", "i", "6 %", "-", "per year", "interest_rate")
    page.input("Life of the plant", "", 15, "year", "", "plant_life")
    page.input("Production days in a year", "", 320, "day", "", "production_days")
    percent = DataValidation(type="decimal", operator="between", formula1="0.01", formula2="1", allow_blank=False,
                             showErrorMessage=False, promptTitle="Efficiency", prompt="0.01 to 1, or a text such as \"62 %\"",
                             showInputMessage=True)
    page.sheet.add_data_validation(percent)
    percent.add(efficiency)


def fluid(workbook: Workbook) -> None:
    page = Page(workbook, "Fluid", "Fluid properties", "Water from the IAPWS release; protein as a compact sphere.")
    page.section("Water and permeate")
    page.calculated("Viscosity of the permeate", "µ", "=UF_WATER_VISCOSITY(temperature)", "mPa·s",
                    "taken as water at process temperature", "permeate_viscosity")
    page.calculated("Density of water", "ρ_w", "=UF_WATER_DENSITY(temperature)", "kg/m³", "", "water_density", "0.0")
    page.calculated("Flux factor to 20 °C", "", "=UF_VISCOSITY_RATIO(temperature)", "-",
                    "a flux at process temperature times this is the flux at 20 °C", "", "0.0000")
    page.section("Protein")
    page.input("Molar mass", "M", 36.7, "kDa", "beta-lactoglobulin, the dimer: the main protein of whey", "molar_mass")
    page.input("Partial specific volume", "v", 0.75, "mL/g", "", "specific_volume")
    page.input("Intrinsic viscosity", "[η]", 3.9, "mL/g", "from the trial", "intrinsic_viscosity")
    page.input("Crowding over shape factor", "k/ν", 0.45, "-", "from the trial", "crowding_factor")
    page.calculated("Diffusion coefficient", "D", "=UF_DIFFUSION_YOUNG(molar_mass,temperature,permeate_viscosity)", "m²/s",
                    "globular proteins; Young, Carroad & Bell 1980", "diffusion_coefficient", "0.00E+00")
    page.calculated("Stokes radius", "r_s", "=UF_RADIUS_STOKES(diffusion_coefficient,temperature,permeate_viscosity)", "nm",
                    "consistent with D", "", "0.00")
    page.section("Osmotic pressure of whey protein, π = b1·C + b2·C² + b3·C³")
    for n, unit in ((1, "bar/(g/L)"), (2, "bar/(g/L)²"), (3, "bar/(g/L)³")):
        page.calculated(f"Coefficient {n}", f"b_{n}", f'=UF_SOLUTE("whey protein","osmotic_coefficient_{n}")', unit,
                        "published fit from the solute table" if n == 1 else "", f"osmotic_{n}", "0.000E+00")
    page.calculated("At the final concentration", "π", "=UF_OSMOTIC_POLYNOMIAL(final_concentration,osmotic_1,osmotic_2,osmotic_3)",
                    "bar", "", "", "0.000")
    page.section("Retentate at the final concentration")
    page.calculated("Density", "ρ", "=UF_DENSITY_SOLUTION(final_concentration,specific_volume,temperature)", "kg/m³", "",
                    "retentate_density", "0.0")
    page.calculated("Viscosity", "µ", "=UF_VISCOSITY_ROSS_MINTON(final_concentration,intrinsic_viscosity,crowding_factor,"
                    "permeate_viscosity)", "mPa·s", "Ross & Minton 1977", "retentate_viscosity")


def trial(workbook: Workbook) -> None:
    page = Page(workbook, "Trial", "Trial: limiting flux against concentration",
                "Invented readings at the process temperature and crossflow, far above the knee.")
    page.section("Clean-water test")
    page.calculated("Permeability at 20 °C", "L_p", "=UF_PERMEABILITY_MEASURED(clean_water_flux,clean_water_pressure,"
                    "clean_water_temperature)", "L/(m²·h·bar)", "corrected with the viscosity of water", "permeability_20", "0.0")
    page.calculated("Resistance of the membrane", "R_m", "=UF_RESISTANCE_FROM_PERMEABILITY(permeability_20)", "1/m", "",
                    "membrane_resistance", "0.00E+00")
    page.calculated("Resistance of the fouling", "R_f", "=fouling_ratio*membrane_resistance", "1/m", "", "fouling_resistance",
                    "0.00E+00")
    page.section("Readings")
    top = page.row + 2
    page.header(["Reading", "Protein", "Flux", "Fit"], ["", "g/L", "L/(m²·h)", "L/(m²·h)"])
    last = top + len(TRIAL) - 1
    concentrations, fluxes = column_range(top, last, 2), column_range(top, last, 3)
    for row, (concentration, flux) in enumerate(TRIAL, top):
        page.cells(row, [f"Reading {row - top + 1}", concentration, flux, f"=UF_FLUX_LIMITING(trial_k,trial_gel,B{row})"],
                   ["Normal", "Input", "Input", "Calculation"], ["General", "0", "0.0", "0.0"])
    page.row = last + 2
    page.section("Gel-model fit")
    fit = f"UF_GEL_FIT({concentrations},{fluxes})"
    for n, (label, symbol, unit, name, fmt) in enumerate((
            ("Mass-transfer coefficient", "k", "L/(m²·h)", "trial_k", "0.00"),
            ("Gel concentration", "C_g", "g/L", "trial_gel", "0.0"),
            ("Standard error of k", "", "L/(m²·h)", "trial_k_error", "0.00"),
            ("Standard error of C_g", "", "g/L", "trial_gel_error", "0.0"),
            ("Coefficient of determination", "r²", "-", "", "0.0000"),
            ("95 % interval of C_g, lower end", "", "g/L", "", "0.0"),
            ("95 % interval of C_g, upper end", "", "g/L", "", "0.0")), 1):
        page.calculated(label, symbol, f"=INDEX({fit},1,{n})", unit, "least squares of J on ln C" if n == 1 else "", name, fmt)
    chart = scatter(page, f"A{page.row + 1}", "Trial: flux against concentration", "Protein in the bulk, g/L", "Flux, L/(m²·h)")
    sheet = page.sheet
    x = Reference(sheet, min_col=2, min_row=top, max_row=last)
    add_series(chart, x, Reference(sheet, min_col=3, min_row=top, max_row=last), "measured", "C55A11", marker=True)
    add_series(chart, x, Reference(sheet, min_col=4, min_row=top, max_row=last), "k ln(C_g/C_b)", "2E5597")
    chart.x_axis.scaling.logBase = 10
    chart.x_axis.scaling.min, chart.x_axis.scaling.max = 1, 1000


def transfer(workbook: Workbook) -> None:
    page = Page(workbook, "Mass transfer", "Channel hydraulics and mass transfer",
                "Spacer-filled channel at the middle of the concentration range; Schock & Miquel 1987.")
    page.section("Channel")
    page.calculated("Hydraulic diameter", "d_h", "=UF_HYDRAULIC_DIAMETER_SPACER(channel_height,spacer_voidage,filament_diameter)",
                    "mm", "", "hydraulic_diameter")
    page.calculated("Flow area of one module", "A_f", "=UF_FLOW_AREA_SPACER(module_area,channel_length,channel_height,"
                    "spacer_voidage)", "m²", "both leaves of the channel carry membrane", "flow_area", "0.00000")
    page.calculated("Crossflow of one module", "Q_c", "=velocity*flow_area*3600", "m³/h", "", "module_crossflow", "0.00")
    page.section("Retentate at the geometric mean concentration")
    page.calculated("Protein", "C_b", "=SQRT(feed_concentration*final_concentration)", "g/L", "", "mean_concentration", "0.0")
    page.calculated("Viscosity", "µ", "=UF_VISCOSITY_ROSS_MINTON(mean_concentration,intrinsic_viscosity,crowding_factor,"
                    "permeate_viscosity)", "mPa·s", "", "mean_viscosity")
    page.calculated("Density", "ρ", "=UF_DENSITY_SOLUTION(mean_concentration,specific_volume,temperature)", "kg/m³", "",
                    "mean_density", "0.0")
    page.calculated("Reynolds number", "Re", "=UF_REYNOLDS(velocity,hydraulic_diameter,mean_density,mean_viscosity)", "-", "",
                    "reynolds", "0")
    page.calculated("Schmidt number", "Sc", "=UF_SCHMIDT(mean_viscosity,mean_density,diffusion_coefficient)", "-", "", "schmidt", "0")
    page.calculated("Sherwood number", "Sh", "=UF_SHERWOOD_SPACER(reynolds,schmidt)", "-", "0.065 Re^0.875 Sc^0.25", "sherwood", "0.0")
    page.output("Mass-transfer coefficient", "k", "=UF_TRANSFER_COEFFICIENT(sherwood,diffusion_coefficient,hydraulic_diameter)",
                "L/(m²·h)", "", "transfer_coefficient")
    page.calculated("What UF_WHY says of it", "", '=UF_WHY("UF_SHERWOOD_SPACER",reynolds,schmidt)', "", "ok where Re lies in the fitted range",
                    "", "General")
    page.section("Pressure")
    page.calculated("Loss along one module", "Δp", "=UF_PRESSURE_DROP_SPACER(velocity,channel_height,spacer_voidage,"
                    "filament_diameter,channel_length,mean_viscosity,mean_density)", "bar", "f = 6.23 Re^-0.3", "module_loss")
    page.calculated("Loss along one vessel", "Δp", "=modules_in_series*module_loss", "bar", "", "vessel_loss")
    page.output("Transmembrane pressure", "Δp_tm", "=UF_TRANSMEMBRANE_PRESSURE(inlet_pressure,inlet_pressure-vessel_loss,"
                "permeate_pressure)", "bar", "mean of inlet and outlet", "operating_pressure", "0.00")
    page.check("Trial and correlation agree on k within 35 %?",
               '=IF(ABS(transfer_coefficient/trial_k-1)<=0.35,"ok","differs: trust the trial")',
               "a correlation for spacers is no better than this")


def polarization(workbook: Workbook) -> None:
    page = Page(workbook, "Polarization", "Concentration polarization at the operating point",
                "Film model with the osmotic pressure at the membrane surface; the retentate of the mass-transfer sheet.")
    page.section("Membrane at process temperature")
    page.calculated("Permeability, clean", "L_p", "=UF_PERMEABILITY_AT(permeability_20,temperature)", "L/(m²·h·bar)", "", "", "0.0")
    page.calculated("Permeability, fouled", "L_p", "=UF_PERMEABILITY_FROM_RESISTANCE(membrane_resistance+fouling_resistance,"
                    "permeate_viscosity)", "L/(m²·h·bar)", "", "permeability", "0.0")
    page.section("Operating point")
    osmotic = "permeability,transfer_coefficient,mean_concentration,osmotic_1,osmotic_2,osmotic_3,intrinsic_rejection"
    page.output("Flux", "J", f"=UF_FLUX_OSMOTIC(operating_pressure,{osmotic})", "L/(m²·h)", "osmotic-pressure model", "operating_flux")
    page.calculated("Polarization modulus", "C_w/C_b", "=UF_POLARIZATION_MODULUS(operating_flux,transfer_coefficient,"
                    "intrinsic_rejection)", "-", "", "modulus", "0.00")
    page.calculated("Protein at the membrane surface", "C_w", "=modulus*mean_concentration", "g/L", "", "wall_concentration", "0.0")
    page.calculated("Protein in the permeate", "C_p", "=(1-intrinsic_rejection)*wall_concentration", "g/L", "", "permeate_protein", "0.00")
    page.calculated("Observed rejection", "R", "=UF_REJECTION_FROM_INTRINSIC(intrinsic_rejection,operating_flux,transfer_coefficient)",
                    "-", "polarization costs rejection", "observed_rejection", "0.0000")
    page.calculated("Osmotic pressure at the surface", "π_w", "=UF_OSMOTIC_POLYNOMIAL(wall_concentration,osmotic_1,osmotic_2,osmotic_3)",
                    "bar", "", "", "0.00")
    page.section("Against the gel model")
    page.calculated("Limiting flux", "J_lim", "=UF_FLUX_LIMITING(transfer_coefficient,trial_gel,mean_concentration)", "L/(m²·h)",
                    "with the gel concentration of the trial", "limiting_flux", "0.0")
    page.calculated("Pressure at which 90 % of it is reached", "Δp_tm", "=UF_PRESSURE_KNEE(permeate_viscosity,membrane_resistance,"
                    "transfer_coefficient,trial_gel,mean_concentration,0.9,fouling_resistance)", "bar",
                    "more pressure than this buys fouling, not flux", "knee_pressure", "0.00")
    page.check("Flux with the observed rejection closes?",
               '=IF(ABS(1-permeate_protein/mean_concentration-observed_rejection)<0.000001,"ok","does not close")',
               "observed rejection from concentrations and from the film model")
    page.check("Operating pressure at or below twice the knee?", '=IF(operating_pressure<=2*knee_pressure,"ok","look again")')


def pressure_curve(workbook: Workbook) -> None:
    page = Page(workbook, "Flux and pressure", "Flux against pressure",
                "Pressure-controlled and limiting branch at the operating concentration.",
                {"A": 24, "B": 14, "C": 14, "D": 14, "E": 17, "F": 14, "G": 56})
    page.header(["Transmembrane pressure", "Darcy", "Limiting flux", "Gel model", "Osmotic model", "Surface", "Branch (gel model)"],
                ["bar", "L/(m²·h)", "L/(m²·h)", "L/(m²·h)", "L/(m²·h)", "g/L", ""])
    first, last = page.row, page.row + len(PRESSURES) - 1
    gel = "permeate_viscosity,membrane_resistance,transfer_coefficient,trial_gel,mean_concentration,fouling_resistance"
    for row, pressure in enumerate(PRESSURES, first):
        page.cells(row, [
            pressure,
            f"=UF_FLUX_DARCY(A{row},permeate_viscosity,membrane_resistance,fouling_resistance)",
            "=limiting_flux",
            f"=UF_FLUX_GEL(A{row},{gel})",
            f"=UF_FLUX_OSMOTIC(A{row},permeability,transfer_coefficient,mean_concentration,osmotic_1,osmotic_2,osmotic_3,"
            "intrinsic_rejection)",
            f"=mean_concentration*UF_POLARIZATION_MODULUS(E{row},transfer_coefficient,intrinsic_rejection)",
            f'=UF_WHY("UF_FLUX_GEL",A{row},{gel})',
        ], ["Input", *["Calculation"] * 6], ["0.00", *["0.0"] * 5, "General"])
    chart = scatter(page, f"A{last + 3}", "Flux against transmembrane pressure", "Transmembrane pressure, bar", "Flux, L/(m²·h)", (22, 11))
    x = Reference(page.sheet, min_col=1, min_row=first, max_row=last)
    for column, title, color, dashed in ((2, "pressure-controlled: Darcy", "7F7F7F", True), (3, "limiting flux", "C55A11", True),
                                         (4, "gel model", "2E5597", False), (5, "osmotic model", "548235", False)):
        add_series(chart, x, Reference(page.sheet, min_col=column, min_row=first, max_row=last), title, color, dashed=dashed)
    chart.y_axis.scaling.max, chart.y_axis.scaling.min = 160, 0
    chart.x_axis.scaling.min, chart.x_axis.scaling.max = 0, 6


def concentration_curve(workbook: Workbook) -> None:
    page = Page(workbook, "Flux and concentration", "Flux against concentration",
                "The osmotic model with the mass-transfer coefficient of each concentration; the cascade reads this table.",
                {"A": 24, "B": 14, "C": 14, "D": 17, "E": 14, "F": 24})
    page.header(["Protein in the bulk", "Viscosity", "k", "Osmotic model", "Surface", "Gel model of the trial"],
                ["g/L", "mPa·s", "L/(m²·h)", "L/(m²·h)", "g/L", "L/(m²·h)"])
    first, last = page.row, page.row + len(CONCENTRATIONS) - 1
    for row, concentration in enumerate(CONCENTRATIONS, first):
        page.cells(row, [
            concentration,
            f"=UF_VISCOSITY_ROSS_MINTON(A{row},intrinsic_viscosity,crowding_factor,permeate_viscosity)",
            f"=UF_TRANSFER_SPACER(velocity,channel_height,spacer_voidage,filament_diameter,diffusion_coefficient,B{row},"
            f"UF_DENSITY_SOLUTION(A{row},specific_volume,temperature))",
            f"=UF_FLUX_OSMOTIC(operating_pressure,permeability,C{row},A{row},osmotic_1,osmotic_2,osmotic_3,intrinsic_rejection)",
            f"=A{row}*UF_POLARIZATION_MODULUS(D{row},C{row},intrinsic_rejection)",
            f"=UF_FLUX_LIMITING(trial_k,trial_gel,A{row})",
        ], ["Input", *["Calculation"] * 5], ["0", "0.000", "0.0", "0.0", "0.0", "0.0"])
    page.name("table_concentration", f"$A${first}:$A${last}")
    page.name("table_flux", f"$D${first}:$D${last}")
    chart = scatter(page, f"A{last + 3}", "Flux against concentration", "Protein in the bulk, g/L", "Flux, L/(m²·h)", (22, 11))
    x = Reference(page.sheet, min_col=1, min_row=first, max_row=last)
    add_series(chart, x, Reference(page.sheet, min_col=4, min_row=first, max_row=last), "osmotic model, design", "2E5597")
    add_series(chart, x, Reference(page.sheet, min_col=6, min_row=first, max_row=last), "gel model of the trial", "C55A11", dashed=True)
    chart.x_axis.scaling.logBase = 10
    chart.x_axis.scaling.min, chart.x_axis.scaling.max = 1, 100


def cascade(workbook: Workbook) -> None:
    page = Page(workbook, "Cascade", "Stage cascade, area and modules",
                "Feed-and-bleed stages in series; the intermediate concentrations give the least total area.",
                {"A": 34, "B": 14, "C": 14, "D": 16, "E": 14, "F": 14, "G": 14})
    page.section("Feed")
    page.calculated("Availability", "a", "=UF_AVAILABILITY(cleaning_interval,cleaning_duration)", "-", "share of the day in service",
                    "availability", "0.000")
    page.calculated("Feed flow in service", "Q_f", "=daily_volume/(24*availability)", "m³/h", "", "feed_flow", "0.00")
    page.section("Stages")
    top = page.row + 2
    page.header(["Stage", "Protein", "Flux", "Permeate", "Retentate", "Area", "Yield"],
                ["", "g/L", "L/(m²·h)", "m³/h", "m³/h", "m²", "-"])
    last = top + STAGES
    for row in range(top, last + 1):
        label = "Total" if row == last else f"Stage {row - top + 1}"
        page.sheet[f"A{row}"] = label
    page.array(f"B{top}", f"G{last}", f"=UF_STAGES_TABLE(feed_flow,feed_concentration,final_concentration,{STAGES},"
               "table_concentration,table_flux,observed_rejection)", "0.00")
    for row in range(top, last + 1):
        page.sheet[f"G{row}"].number_format = "0.0000"
    page.sheet.conditional_formatting.add(
        f"C{top}:C{last - 1}", FormulaRule(formula=[f"C{top}<20"], fill=PatternFill("solid", bgColor="FFC7CE")))
    page.row = last + 2
    page.section("Modules")
    head = page.row + 2
    page.header(["Stage", "Modules", "Vessels", "Installed area", "Loop flow"], ["", "-", "-", "m²", "m³/h"])
    for n in range(STAGES):
        row, source = head + n, top + n
        page.sheet[f"A{row}"] = f"Stage {n + 1}"
        page.cells(row, [f"Stage {n + 1}", f"=C{row}*modules_in_series",
                         f"=UF_MODULES(F{source},module_area*modules_in_series,spare_fraction)",
                         f"=B{row}*module_area", f"=C{row}*module_crossflow"],
                   ["Normal", *["Calculation"] * 4], ["General", "0", "0", "0", "0.0"])
    bottom = head + STAGES
    page.cells(bottom, ["Total", *(f"=SUM({c}{head}:{c}{bottom - 1})" for c in "BCDE")], ["Total", *["Output"] * 4],
               ["General", "0", "0", "0", "0.0"])
    for name, cell in (("total_area", f"F{last}"), ("total_permeate", f"D{last}"), ("mean_flux", f"C{last}"),
                       ("final_retentate", f"E{last}"), ("cascade_yield", f"G{last}"), ("total_modules", f"B{bottom}"),
                       ("installed_area", f"D{bottom}"), ("total_loop_flow", f"E{bottom}")):
        page.name(name, f"${cell[0]}${cell[1:]}")
    page.row = bottom + 2
    page.section("Balances")
    page.calculated("Recovery", "", "=UF_RECOVERY(feed_flow,total_permeate)", "-", "", "recovery", "0.000")
    page.calculated("Volume concentration factor", "X", "=UF_CONCENTRATION_FACTOR(feed_flow,final_retentate)", "-",
                    "of flows instead of volumes", "", "0.00")
    page.check("Water balance closes?", '=IF(ABS(feed_flow-total_permeate-final_retentate)<0.000001*feed_flow,"ok","does not close")')
    page.check("Installed area covers the need?", '=IF(installed_area>=total_area*(1+UF_CONVERT("5","%","-")),"ok","too small")')
    chart = BarChart()
    chart.title, chart.style, chart.type, chart.width, chart.height = "Area of the stages", 2, "col", 15, 8
    chart.add_data(Reference(page.sheet, min_col=6, min_row=top, max_row=last - 1))
    chart.set_categories(Reference(page.sheet, min_col=1, min_row=top, max_row=last - 1))
    chart.legend = None
    chart.y_axis.title, chart.y_axis.delete, chart.x_axis.delete = "m²", False, False
    chart.y_axis.majorGridlines = None
    chart.series[0].graphicalProperties.solidFill = "2E5597"
    page.sheet.add_chart(chart, f"A{page.row + 1}")


if __name__ == "__main__":
    write_with_values(build, Path(__file__).with_suffix(".xlsx"))
