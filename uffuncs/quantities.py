"""The vocabulary: every argument and result, named, given its unit and bounded once.

A name means one thing in every function. Bounds are physical: outside them a value is a slip (kelvin typed for °C, pascal
for bar), never an unusual plant. The range in which a correlation was fitted is narrower and belongs to the function.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from .units import worksheet_unit


@dataclass(frozen=True)
class Quantity:
    """One entry of the vocabulary; bounds in the worksheet unit."""

    name: str
    symbol: str
    unit: str
    low: float
    high: float
    meaning: str
    whole: bool = False  # a count: only whole numbers
    absolute: bool = False  # an absolute pressure; all others are gauge pressures or differences

    @cached_property
    def si_unit(self) -> str:
        return worksheet_unit(self.unit)[0]

    @cached_property
    def scale(self) -> float:
        return worksheet_unit(self.unit)[1]

    @cached_property
    def offset(self) -> float:
        return worksheet_unit(self.unit)[2]

    def from_si(self, value: float) -> float:
        return (value - self.offset) / self.scale

    def to_si(self, value: float) -> float:
        return self.scale * value + self.offset

    def shown(self, value_si: float) -> str:
        """An SI value as text in the worksheet unit, for reasons and cautions."""
        unit = "" if self.unit == "-" else f" {self.unit}"
        return f"{float(self.from_si(value_si)):.6g}{unit}"

    @property
    def bounds_text(self) -> str:
        unit = "" if self.unit == "-" else f" {self.unit}"
        return f"{self.low:g} to {self.high:g}{unit}"


VOCABULARY: dict[str, Quantity] = {}


def _define(name, symbol, unit, low, high, meaning, **flags):
    if name in VOCABULARY:
        raise ValueError(f"{name} is in the vocabulary already")
    VOCABULARY[name] = Quantity(name, symbol, unit, low, high, meaning, **flags)


def _define_alike(names: str, like: str, **meanings: str):
    """Further names with the unit and bounds of a defined one."""
    q = VOCABULARY[like]
    for name in names.split():
        symbol, meaning = meanings[name].split("|")
        _define(name, symbol, q.unit, q.low, q.high, meaning, whole=q.whole, absolute=q.absolute)


LMH, LMH_BAR, PER_M = "L/(m²·h)", "L/(m²·h·bar)", "1/m"

# --- temperature and fluid ---------------------------------------------------------------------------------------
_define("temperature", "T", "°C", -20, 150, "Temperature of the liquid at the membrane")
_define("reference_temperature", "T_ref", "°C", -20, 150, "Temperature that a value is corrected to")
_define("viscosity", "µ", "mPa·s", 0.01, 1e6, "Dynamic viscosity")
_define("solvent_viscosity", "µ_0", "mPa·s", 0.01, 1e6, "Dynamic viscosity of the solvent alone")
_define("viscosity_ratio", "µ/µ_ref", "-", 0, 1e3, "Viscosity at T over viscosity at the reference temperature")
_define("bulk_to_wall_viscosity", "µ_b/µ_w", "-", 1e-6, 1e3, "Viscosity in the bulk over viscosity at the membrane surface")
_define("density", "ρ", "kg/m³", 500, 3000, "Density of the liquid")
_define("solution_density", "ρ", "kg/m³", 500, 3000, "Density of the solution")
_define("particle_density", "ρ_p", "kg/m³", 500, 25000, "Density of the particles themselves")
_define("surface_tension", "σ", "mN/m", 0.1, 1000, "Surface tension of the wetting liquid against air")
_define("interfacial_tension", "σ", "mN/m", 0.001, 1000, "Interfacial tension between droplet and liquid")
_define("heat_capacity", "c_p", "kJ/(kg·K)", 0.5, 20, "Specific heat capacity of the liquid")
_define("consistency", "K", "Pa·sⁿ", 1e-6, 1e4, "Consistency of a power-law liquid")
_define("flow_index", "n", "-", 0.05, 3, "Flow index of a power-law liquid; 1 is Newtonian")
_define("temperature_rise", "ΔT", "°C difference", 0, 1000, "Temperature rise")

# --- solutes ----------------------------------------------------------------------------------------------------
_define("concentration", "C", "g/L", 0, 2000, "Mass concentration of the solute")
_define_alike(
    "bulk_concentration feed_concentration permeate_concentration retentate_concentration surface_concentration",
    "concentration",
    bulk_concentration="C_b|Mass concentration in the bulk of the feed side",
    feed_concentration="C_0|Mass concentration in the feed",
    permeate_concentration="C_p|Mass concentration in the permeate",
    retentate_concentration="C_r|Mass concentration in the retentate",
    surface_concentration="C_w|Mass concentration at the membrane surface",
)
_define("final_concentration", "C_n", "g/L", 0, 2000, "Mass concentration that leaves the last stage")
_define("gel_concentration", "C_g", "g/L", 0.001, 2000, "Mass concentration at which the limiting flux is zero")
_define("salt_concentration", "m", "mol/L", 0, 10, "Amount concentration of a 1:1 salt")
_define("mass_fraction", "w", "-", 0, 1, "Mass of solute per mass of solution")
_define("volume_fraction", "φ", "-", 0, 1, "Volume of solute or particles per volume of suspension")
_define("maximum_volume_fraction", "φ_m", "-", 0.01, 1, "Volume fraction of the densest packing")
_define("molar_mass", "M", "kDa", 1e-3, 1e6, "Molar mass")
_define("cut_off", "M_c", "kDa", 1e-3, 1e6, "Molar mass rejected to the level named, 90 % by convention")
_define("partial_specific_volume", "v", "mL/g", 0, 10, "Partial specific volume of the solute")
_define("hydration", "h", "g/g", 0, 20, "Water bound per mass of dry solute")
_define("intrinsic_viscosity", "[η]", "mL/g", 0, 1e5, "Intrinsic viscosity")
_define("intrinsic_viscosity_number", "[η]_φ", "-", 0, 1000, "Intrinsic viscosity on volume fraction; 2.5 for spheres")
_define("crowding_factor", "k/ν", "-", 0, 10, "Crowding factor over Simha shape parameter")
_define("diffusion_coefficient", "D", "m²/s", 1e-16, 1e-6, "Diffusion coefficient of the solute")
_define("solute_radius", "r_s", "nm", 0.01, 1e5, "Radius of the solute, taken as a sphere")
_define("particle_radius", "r", "µm", 1e-3, 1e4, "Radius of the particles")
_define("particle_diameter", "d_p", "µm", 1e-4, 1e4, "Sauter mean diameter of the particles")
_define("droplet_diameter", "d_d", "µm", 1e-3, 1e5, "Diameter of the droplet")
_define("charge_number", "Z", "-", -1000, 1000, "Net charges on one molecule, with their sign")
_define("donnan_ratio", "r", "-", 0, 1, "Co-ion concentration in the retentate over that in the permeate")

# --- osmotic pressure -------------------------------------------------------------------------------------------
_define("osmotic_pressure", "Δπ", "bar", 0, 1000, "Osmotic pressure difference across the membrane")
_define("second_virial_coefficient", "B_2", "mol·mL/g²", -1, 1, "Second osmotic virial coefficient")
_define("third_virial_coefficient", "B_3", "mol·mL²/g³", -100, 100, "Third osmotic virial coefficient")
_define("first_coefficient", "b_1", "bar/(g/L)", -1, 100, "First coefficient of the osmotic polynomial")
_define("second_coefficient", "b_2", "bar/(g/L)²", -1, 10, "Second coefficient of the osmotic polynomial")
_define("third_coefficient", "b_3", "bar/(g/L)³", -1, 10, "Third coefficient of the osmotic polynomial")
_define("power_coefficient", "b", "bar/(g/L)ⁿ", 0, 100, "Coefficient of the osmotic power law")
_define("exponent", "n", "-", 0.1, 20, "Exponent of the osmotic power law")
_define("nonideality_2", "a_2", "L/g", -1, 1, "Second nonideality coefficient, relative to the ideal term")
_define("nonideality_3", "a_3", "L²/g²", -1, 1, "Third nonideality coefficient, relative to the ideal term")
_define("terms", "N", "-", 1, 3, "Number of terms of the polynomial", whole=True)

# --- membrane and pores -----------------------------------------------------------------------------------------
_define("porosity", "ε", "-", 1e-6, 1, "Open share of the membrane's skin")
_define("pore_diameter", "d_pore", "nm", 0.1, 1e5, "Pore diameter")
_define("pore_radius", "r_pore", "nm", 0.05, 5e4, "Pore radius; half-width of a slit")
_define("median_pore_radius", "r_m", "nm", 0.05, 5e4, "Median pore radius by number")
_define("geometric_standard_deviation", "σ_g", "-", 1, 10, "Geometric standard deviation of the pore radius")
_define("tortuosity", "τ", "-", 1, 20, "Length of the pore over thickness of the membrane")
_define("membrane_thickness", "l", "µm", 1e-3, 1e4, "Thickness of the membrane's separating layer")
_define("permeability", "L_p", LMH_BAR, 0, 1e6, "Permeate flux per transmembrane pressure")
_define("resistance", "R", PER_M, 1e6, 1e18, "Hydraulic resistance")
_define("membrane_resistance", "R_m", PER_M, 1e6, 1e18, "Hydraulic resistance of the clean membrane")
_define("initial_resistance", "R_0", PER_M, 1e6, 1e18, "Total hydraulic resistance at the start")
_define("fouling_resistance", "R_f", PER_M, 0, 1e18, "Hydraulic resistance added by fouling")
_define("cake_resistance", "R_c", PER_M, 0, 1e18, "Hydraulic resistance of the cake")
_define("total_resistance", "R_t", PER_M, 0, 1e18, "Total hydraulic resistance")
_define("specific_cake_resistance", "α", "m/kg", 0, 1e20, "Cake resistance per mass of cake and membrane area")
_define("cake_resistance_concentration", "α·c", "1/m²", 0, 1e22, "Specific cake resistance times solids concentration")
_define("cake_thickness", "δ", "µm", 0, 1e5, "Thickness of the cake")
_define("cake_porosity", "ε", "-", 0.01, 0.999, "Void fraction of the cake")
_define("resistance_rate", "dR/dt", "1/(m·h)", -1e16, 1e16, "Growth of the total resistance with time")
_define("partition_coefficient", "K", "-", 0, 1, "Concentration in the pore mouth over that outside")
_define("pore_transfer_coefficient", "D_pore/l", LMH, 0, 1e6, "Effective diffusion coefficient in the pores over thickness")
_define("rejection", "R", "-", 0, 1, "Rejection, 1 − C_p/C_b")
_define("intrinsic_rejection", "R_i", "-", 0, 1, "Rejection at the membrane surface, 1 − C_p/C_w")
_define("sieving_coefficient", "S", "-", 0, 1, "Sieving coefficient, C_p/C_b")
_define("reflection_coefficient", "σ", "-", 0, 1, "Osmotic reflection coefficient")
_define("hindrance_factor", "H", "-", 0, 1, "Diffusive hindrance factor, on the bulk concentrations")
_define("spread", "s", "-", 0, 10, "Standard deviation of the logarithm of the molar mass")
_define("level", "R_c", "-", 0.01, 0.999, "Rejection that defines the cut-off")
_define("log_removal", "LRV", "-", 0, 20, "Log removal value, log10 of feed over permeate count")
_define("feed_count", "N_f", "-", 0, 1e30, "Count in the feed, any one unit")
_define("permeate_count", "N_p", "-", 0, 1e30, "Count in the permeate, in the unit of the feed count")
_define("detection_limit", "N_d", "-", 0, 1e30, "Lowest count that the method can tell, in the same unit")

# --- pressures --------------------------------------------------------------------------------------------------
_define("transmembrane_pressure", "Δp_tm", "bar", 0, 200, "Mean feed-side minus permeate pressure")
_define("reference_pressure", "p_ref", "bar", 1e-4, 200, "Transmembrane pressure that a flux is corrected to")
_define("feed_pressure", "p_f", "bar", -1.1, 200, "Pressure at the feed inlet, gauge")
_define("retentate_pressure", "p_r", "bar", -1.1, 200, "Pressure at the retentate outlet, gauge")
_define("permeate_pressure", "p_p", "bar", -1.1, 200, "Pressure on the permeate side, gauge; suction is negative")
_define("pressure_limit", "Δp_max", "bar", 1e-4, 200, "Highest transmembrane pressure allowed")
_define("critical_pressure", "p_c", "bar", 0, 1e8, "Transmembrane pressure that pushes a droplet into a pore")
_define("pressure_drop", "Δp", "bar", 0, 1e4, "Pressure loss along the channel")
_define("pressure_rise", "Δp", "bar", 0, 1000, "Pressure rise over the pump")
_define("feed_pressure_rise", "Δp_f", "bar", 0, 1000, "Pressure rise over the feed pump")
_define("loop_pressure_drop", "Δp_l", "bar", 0, 1000, "Pressure loss around the recirculation loop")
_define("inlet_pressure", "p_1", "bar", -1, 100, "Pressure at the blower's inlet, gauge")
_define("outlet_pressure", "p_2", "bar", -1, 100, "Pressure at the blower's outlet, gauge")
_define("bubble_point", "p_b", "bar", 1e-6, 1e4, "Bubble-point pressure")
_define("test_pressure", "p_test", "bar", 0.001, 50, "Applied test pressure at the start, gauge")
_define("back_pressure", "p_back", "bar", 0, 50, "Pressure against the air at the lowest point of the unit, gauge")
_define("atmospheric_pressure", "p_atm", "bar", 0.3, 1.2, "Atmospheric pressure at the place, absolute", absolute=True)
_define("fraction", "x", "-", 0.001, 1, "Share of the limiting flux")

# --- flux -------------------------------------------------------------------------------------------------------
_define("flux", "J", LMH, 0, 1e5, "Permeate flow per membrane area")
_define_alike(
    "clean_flux fouled_flux rinsed_flux cleaned_flux initial_flux final_flux backwash_flux limiting_flux net_flux",
    "flux",
    clean_flux="J_0|Water flux of the clean membrane",
    fouled_flux="J_f|Water flux of the fouled membrane",
    rinsed_flux="J_r|Water flux after a rinse",
    cleaned_flux="J_c|Water flux after chemical cleaning",
    initial_flux="J_0|Flux at the start",
    final_flux="J_f|Flux at the end",
    backwash_flux="J_b|Backwash flow per membrane area",
    limiting_flux="J_lim|Flux that more pressure does not raise",
    net_flux="J_net|Flux after backwash and downtime",
)
_define("normalized_flux", "J/J_0", "-", 1e-6, 100, "Flux at one pressure and temperature over its first value")
_define("maximum_flux", "J_max", LMH, 1e-6, 1e5, "Highest flux that the pressure allows, for example the clean-water flux")
_define("mass_transfer_coefficient", "k", LMH, 0, 1e5, "Mass-transfer coefficient of the solute on the feed side")
_define("polarization_modulus", "C_w/C_b", "-", 0, 1e300, "Surface over bulk concentration")
_define("tolerance", "t", "-", 0, 10, "Relative tolerance")
_define("weight", "w", "-", 0, 1, "Weight of the initial flux")

# --- channels, fibers, modules ----------------------------------------------------------------------------------
_define("channel_height", "h", "mm", 0.01, 1000, "Height of the channel between the membranes")
_define("channel_width", "w", "m", 1e-4, 100, "Width of the channel")
_define("channel_length", "L", "m", 1e-4, 1000, "Length of the channel in the direction of flow")
_define("tube_diameter", "d", "mm", 0.01, 1000, "Inner diameter of the tube")
_define("hydraulic_diameter", "d_h", "mm", 0.001, 1000, "Four times the flow area over the wetted perimeter")
_define("filament_diameter", "d_f", "mm", 0.01, 100, "Diameter of a spacer filament")
_define("spacer_voidage", "ε", "-", 0.05, 1, "Void share of the spacer-filled channel")
_define("fiber_diameter", "d", "mm", 0.01, 100, "Diameter of the fiber on the side of the flow")
_define("from_diameter", "d_1", "mm", 0.01, 100, "Diameter of the face that the flux is given on")
_define("to_diameter", "d_2", "mm", 0.01, 100, "Diameter of the face that the flux is wanted on")
_define("fiber_length", "L", "m", 1e-3, 100, "Length of the fiber")
_define("fiber_count", "n", "-", 1, 1e9, "Number of fibers", whole=True)
_define("channel_count", "n", "-", 1, 1e9, "Number of parallel channels", whole=True)
_define("points", "n", "-", 2, 10000, "Number of points along the module", whole=True)
_define("flow_area", "A_f", "m²", 1e-12, 1e4, "Open cross-section of the flow")
_define("area", "A", "m²", 1e-6, 1e7, "Membrane area")
_define("module_area", "A_m", "m²", 1e-4, 1e4, "Membrane area of one module")
_define("velocity", "u", "m/s", 0, 100, "Mean velocity in the channel; between filaments where there is a spacer")
_define("shear_rate", "γ", "1/s", 0, 1e8, "Shear rate at the membrane surface")
_define("reynolds", "Re", "-", 0, 1e8, "Reynolds number")
_define("schmidt", "Sc", "-", 1e-3, 1e10, "Schmidt number")
_define("sherwood", "Sh", "-", 0, 1e9, "Sherwood number")
_define("coefficient", "a", "-", 0, 1e4, "Coefficient of the power law")
_define("reynolds_exponent", "b", "-", -2, 5, "Exponent of the Reynolds number")
_define("schmidt_exponent", "c", "-", -2, 5, "Exponent of the Schmidt number")
_define("ratio_exponent", "e", "-", -5, 5, "Exponent of diameter over length")
_define("diameter_to_length", "d/L", "-", 1e-9, 100, "Hydraulic diameter over length of the channel")
_define("position", "x", "m", 0, 1000, "Distance from the inlet")

# --- time, volume, flow -----------------------------------------------------------------------------------------
_define("time", "t", "h", 0, 1e6, "Time from the start")
_define("new_time", "t_2", "h", 1e-4, 1e6, "Process time at the new scale")
_define("first_time", "t_i", "min", 1e-4, 1e4, "Time to collect the first sample")
_define("last_time", "t_f", "min", 1e-4, 1e4, "Time to collect the last sample")
_define("interval", "T", "min", 1e-3, 1e4, "Time between the starts of the two samples")
_define("filtration_time", "t_f", "min", 1e-3, 1e6, "Filtration time of one cycle")
_define("backwash_time", "t_b", "min", 0, 1e5, "Backwash time of one cycle")
_define("idle_time", "t_i", "min", 0, 1e5, "Time of one cycle without flow: valves, air scour, drain, fill")
_define("cleaning_time", "t_c", "min", 0, 1e4, "Time of one cleaning")
_define("cleanings_per_day", "n_c", "1/day", 0, 1000, "Cleanings in a day")
_define("test_time_per_day", "t_t", "min/day", 0, 1440, "Time of integrity tests in a day")
_define("cleaning_interval", "t_i", "h", 1e-3, 1e6, "Time in service between two cleanings")
_define("cleaning_duration", "t_c", "h", 0, 1e5, "Time of one cleaning out of service")
_define("test_duration_per_day", "t_t", "h/day", 0, 24, "Time of integrity tests in a day")
_define("contact_time", "t", "h", 0, 1e4, "Contact time of one cleaning")
_define("cleanings_per_year", "n", "1/year", 0, 1e5, "Cleanings in a year")
_define("life_years", "n", "year", 0.01, 100, "Service life")
_define("feed_volume", "V_0", "m³", 1e-9, 1e7, "Volume at the start")
_define("retentate_volume", "V", "m³", 1e-9, 1e7, "Volume of the retentate")
_define("volume", "V", "m³", 0, 1e7, "Volume")
_define("new_volume", "V_2", "m³", 1e-9, 1e7, "Volume at the new scale")
_define("pool_volume", "V", "m³", 1e-9, 1e7, "Volume of the recovered pool")
_define("holdup_volume", "h", "m³", 0, 1e5, "Volume that stays in the system")
_define("flush_volume", "F", "m³", 0, 1e5, "Volume of the flush")
_define("system_volume", "V_sys", "m³", 1e-9, 1e5, "Volume of pressurised air in the system during the test")
_define("volume_per_area", "V/A", "L/m²", 0, 1e7, "Permeate volume per membrane area")
_define("flush_volume_per_area", "V_f/A", "L/m²", 0, 1e5, "Flush volume per membrane area in one cycle")
_define("cleaning_volume_per_area", "V_c/A", "L/m²", 0, 1e5, "Water used per membrane area in one cleaning")
_define("flow", "Q", "m³/h", 0, 1e7, "Volume flow")
_define_alike(
    "feed_flow permeate_flow retentate_flow loop_flow crossflow minimum_module_flow maximum_module_flow diafiltration_flow "
    "breach_flow air_flow",
    "flow",
    feed_flow="Q_f|Feed flow",
    permeate_flow="Q_p|Permeate flow",
    retentate_flow="Q_r|Retentate flow",
    loop_flow="Q_l|Flow in the recirculation loop",
    crossflow="Q_c|Flow along the membrane",
    minimum_module_flow="Q_min|Lowest flow that a module may have at its outlet",
    maximum_module_flow="Q_max|Highest flow that a module may have at its inlet",
    diafiltration_flow="W|Flow of diafiltration water",
    breach_flow="Q_b|Flow through the smallest breach that the test must find",
    air_flow="Q_a|Air flow at the conditions of the inlet",
)

# --- concentration and diafiltration ----------------------------------------------------------------------------
_define("concentration_factor", "X", "-", 1, 1e5, "Volume concentration factor, feed over retentate volume")
_define_alike(
    "first_concentration_factor second_concentration_factor volumetric_concentration_factor",
    "concentration_factor",
    first_concentration_factor="X_1|Volume concentration factor of the first concentration",
    second_concentration_factor="X_2|Volume concentration factor of the second concentration",
    volumetric_concentration_factor="VCF|Volumetric concentration factor, membrane side over feed",
)
_define("diavolumes", "N", "-", 0, 1000, "Diafiltration water over constant retentate volume")
_define("remaining_fraction", "f", "-", 1e-30, 1, "Share of a solute that remains")
_define("dilution_ratio", "r", "-", 0, 1000, "Water added over volume before it")
_define("steps", "n", "-", 0, 10000, "Number of steps", whole=True)
_define("yield_fraction", "Y", "-", 0, 1, "Share of the solute that stays in the retentate")
_define("impurity_sieving", "S_i", "-", 0, 1, "Sieving coefficient of the impurity")
_define("product_rejection", "R", "-", 0, 1, "Rejection of the product")
_define("product", "i", "-", 1, 10000, "Row number of the product", whole=True)
_define("target_purity", "x", "-", 0, 1, "Wanted share of the product in total solids")
_define("loading", "m/A", "g/m²", 0, 1e9, "Mass per membrane area")

# --- plant, energy, money ---------------------------------------------------------------------------------------
_define("stages", "n", "-", 1, 50, "Number of stages in series", whole=True)
_define("stage", "i", "-", 1, 1000, "Number of the stage, from the feed", whole=True)
_define("component_number", "j", "-", 1, 10000, "Row number of the component", whole=True)
_define("availability", "a", "-", 0.01, 1, "Share of calendar time in service")
_define("recovery", "Q_p/Q_f", "-", 0, 1, "Permeate over feed flow")
_define("ratio", "r", "-", 0, 1e9, "Ratio")
_define("balance_error", "e", "-", -1e9, 1e9, "Relative error of a balance")
_define("spare_fraction", "s", "-", 0, 10, "Spare area over area in service")
_define("modules", "n", "-", 0, 1e9, "Number of modules", whole=True)
_define("racks", "n", "-", 1, 10000, "Number of racks", whole=True)
_define("racks_out", "n_out", "-", 0, 10000, "Racks out of service", whole=True)
_define("modules_per_rack", "m", "-", 1, 10000, "Modules in one rack", whole=True)
_define("exposure", "C·t", "g·h/(L·year)", 0, 1e9, "Chemical concentration times contact time in a year")
_define("efficiency", "η", "-", 0.01, 1, "Overall efficiency of pump and motor")
_define("power", "P", "kW", 0, 1e7, "Power")
_define("energy", "E", "kWh/m³", 0, 1e6, "Energy per volume of permeate")
_define("energy_price", "c_e", "money/kWh", 0, 1e6, "Price of energy")
_define("capital", "K", "money", 0, 1e15, "Capital outlay")
_define("interest_rate", "i", "-", 0, 1, "Interest rate per year")
_define("discount_rate", "i", "-", 0, 1, "Discount rate per year")
_define("price_per_area", "c_A", "money/m²", 0, 1e6, "Membrane price per area")
_define("membrane_cost", "c_m", "money/m³", 0, 1e9, "Membrane replacement cost per volume of permeate")
_define("other_cost", "c_o", "money/year", 0, 1e15, "Other cost per year: labour, chemicals, maintenance")
_define("cost", "c", "money/m³", 0, 1e15, "Cost per volume of permeate")
_define("permeate_volume_per_year", "V_a", "m³/year", 1e-3, 1e12, "Permeate volume in a year")

# --- fouling and integrity --------------------------------------------------------------------------------------
_define("blocking_coefficient", "k", "-", 0, 1e30, "Blocking coefficient, in the SI unit of its law")
_define("silt_density_index", "SDI", "%/min", 0, 1000, "Silt density index")
_define("fouling_index", "MFI", "s/L²", 0, 1e12, "Modified fouling index")
_define("contact_angle", "θ", "deg", 0, 180, "Contact angle of the liquid on the membrane")
_define("shape_factor", "κ", "-", 0.01, 1, "Pore shape correction; 1 is a cylinder")
_define("defect_diameter", "d", "µm", 1e-3, 1e4, "Diameter of the defect")
_define("resolution", "d", "µm", 1e-2, 1e3, "Smallest defect that the test must answer to; 3 µm for Cryptosporidium")
_define("expansion_factor", "Y", "-", 0.1, 1, "Net expansion factor of compressible flow")
_define("air_liquid_ratio", "ALCR", "-", 1e-3, 1e5, "Air flow over liquid flow through the same breach")
_define("decay_rate", "dp/dt", "mbar/min", -1000, 1e5, "Pressure decay rate, diffusion allowed for")
_define("target_log_removal", "LRV", "-", 0, 20, "Log removal value that the test must verify")

# --- results without a better home ------------------------------------------------------------------------------
_define("standard_error", "s", "-", 0, 1e300, "Standard error")
_define("coefficient_of_determination", "r²", "-", 0, 1, "Share of the variance that the fit explains")
_define("share", "x", "-", 0, 1, "Share of the total")


def quantity(name: str) -> Quantity:
    """The entry of that name.

    Raises
    ------
    KeyError
        No such entry.
    """
    return VOCABULARY[name]
