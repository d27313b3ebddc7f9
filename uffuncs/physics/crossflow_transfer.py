"""Crossflow: Sherwood numbers and mass-transfer coefficients of tubes, slits, spacers and stirred cells."""

from __future__ import annotations

import math

from ..declaration import Fitted, Number, Rule, worksheet_function
from . import _graetz
from .crossflow import (CHANNEL_VISCOSITY, EFFECTIVE_VELOCITY, LAMINAR_BELOW, SCHOCK_MIQUEL, TURBULENT_ABOVE,
                        blended, hydraulic_diameter_spacer)
from .crossflow import reynolds as reynolds_number
from .crossflow import schmidt as schmidt_number

TOPIC = "crossflow"

SHAH_LONDON = "Shah & London, Laminar Flow Forced Convection in Ducts, Academic Press (1978)"
LEVEQUE = f"Lévêque, Annales des Mines 13 (1928) 201; {SHAH_LONDON}"
GRAETZ = f"Graetz, Ann. Phys. Chem. 25 (1885) 337; for plates Nusselt, Z. VDI 67 (1923) 206; {SHAH_LONDON}"
COLBURN = "Colburn, Trans. AIChE 29 (1933) 174 (of the Dittus–Boelter type, with exponent ⅓ on Sc)"
HARRIOTT_HAMILTON = ("Harriott & Hamilton, Solid-liquid mass transfer in turbulent pipe flow, "
                     "Chem. Eng. Sci. 20 (1965) 1073")
PINCZEWSKI_SIDEMAN = ("Pinczewski & Sideman, A model for mass (heat) transfer in turbulent tube flow, "
                      "Chem. Eng. Sci. 29 (1974) 1969")
BELFORT = ("Belfort, Davis & Zydney, The behavior of suspensions and macromolecular solutions in crossflow "
           "microfiltration, J. Membr. Sci. 96 (1994) 1")
GEKAS_HALLSTROM = "Gekas & Hallström, J. Membr. Sci. 30 (1987) 153"
TURBULENT_SOURCE = f"{COLBURN}; {HARRIOTT_HAMILTON}; {PINCZEWSKI_SIDEMAN}; compared by {GEKAS_HALLSTROM}"

CHANNELS = ("tube", "slit")
CHANNEL_MEANING = {"channel": "Cross-section of the channel; slit on the hydraulic diameter 2h"}

#: Sh = a Re^b Sc^c in turbulent flow, and the ranges of Re and Sc in which each was fitted.
TURBULENT = {
    "dittus-boelter": ((0.023, 0.8, 1.0 / 3.0), (1e4, 1.2e5), (0.7, 160.0)),
    "harriott-hamilton": ((0.0096, 0.913, 0.346), (1e4, 1e5), (432.0, 97600.0)),
    "pinczewski-sideman": ((0.0102, 0.9, 0.35), (1e4, 1e5), (1000.0, math.inf)),
}
CORRELATION_MEANING = {"correlation": "Correlation of turbulent flow"}

#: Fitted range of the spacer laws.
SPACER_REYNOLDS = (100.0, 1000.0)


def graetz_number(
    reynolds: Number, schmidt: Number, hydraulic_diameter: Number, channel_length: Number
) -> Number:
    """Re Sc d/L: large near the inlet of a channel, small far down."""
    return reynolds * schmidt * hydraulic_diameter / channel_length


def _of_channel(channel_wanted: str):
    return lambda channel: channel == channel_wanted


@worksheet_function(
    result="sherwood",
    equation="Sh = 1.62 (Re Sc d_h/L)^⅓ in a tube, 1.85 (Re Sc d_h/L)^⅓ in a slit",
    source=LEVEQUE,
    choices={"channel": CHANNELS},
    names=CHANNEL_MEANING,
    fitted=[Fitted("reynolds", 0.0, LAMINAR_BELOW),
            Fitted("Graetz number (tube)", 20.0, math.inf, value=graetz_number, when=_of_channel("tube")),
            Fitted("Graetz number (slit)", 300.0, math.inf, value=graetz_number, when=_of_channel("slit"))],
)
def sherwood_leveque(
    reynolds: Number,
    schmidt: Number,
    hydraulic_diameter: Number,
    channel_length: Number,
    channel: str = "tube",
) -> Number:
    """Average Sherwood number of laminar flow in the entrance of the concentration layer.

    Fully developed velocity, constant concentration at the wall, thin boundary layer. The average over the
    channel length; two thirds of it is the local value at the end. In a tube within 6 % of the exact value
    above a Graetz number Re Sc d/L of 20, in a slit within 5 % above 300; below that it falls under the exact
    value: take sherwood_graetz.
    """
    leading = 1.62 if channel == "tube" else 1.85
    return leading * graetz_number(reynolds, schmidt, hydraulic_diameter, channel_length) ** (1.0 / 3.0)


@worksheet_function(
    result="sherwood",
    equation="Sh = −(Gz/4) ln Σ W_n e^(−a λ_n²/Gz), Gz = Re Sc d_h/L; a = 2 (tube), 32/3 (slit)",
    source=GRAETZ,
    choices={"channel": CHANNELS},
    names=CHANNEL_MEANING,
    fitted=[Fitted("reynolds", 0.0, LAMINAR_BELOW)],
)
def sherwood_graetz(
    reynolds: Number,
    schmidt: Number,
    hydraulic_diameter: Number,
    channel_length: Number,
    channel: str = "tube",
) -> Number:
    """Average Sherwood number of laminar flow at constant wall concentration, exact at any length.

    Fully developed velocity, mixed inlet, walls at one concentration (both walls of a slit, hydraulic
    diameter 2h), no diffusion along the channel. The average belongs to the logarithmic mean of the
    differences bulk to wall. Floors 3.657 in a tube, 7.541 in a slit. By the sum of exponentials, at high
    Graetz numbers by Lévêque's expansion with eleven terms; within 1e-8 of the exact value.
    """
    gz = graetz_number(reynolds, schmidt, hydraulic_diameter, channel_length)
    return _graetz.average(gz, _graetz.CHANNELS[channel])


def _turbulent_ranges():
    """The fitted ranges of each correlation, for its own choice."""
    found = []
    for name, (_, re_range, sc_range) in TURBULENT.items():
        chosen = (lambda wanted: lambda correlation: correlation == wanted)(name)
        found += [Fitted("reynolds", *re_range, when=chosen), Fitted("schmidt", *sc_range, when=chosen)]
    return found


@worksheet_function(
    result="sherwood",
    equation="dittus-boelter 0.023 Re^0.8 Sc^⅓; harriott-hamilton 0.0096 Re^0.913 Sc^0.346; "
             "pinczewski-sideman 0.0102 Re^0.9 Sc^0.35",
    source=TURBULENT_SOURCE,
    choices={"correlation": tuple(TURBULENT)},
    names=CORRELATION_MEANING,
    fitted=_turbulent_ranges(),
)
def sherwood_turbulent(reynolds: Number, schmidt: Number, correlation: str = "dittus-boelter") -> Number:
    """Sherwood number of fully turbulent flow in a smooth tube or slit.

    Far from the inlet, which in turbulent flow is a few diameters. `dittus-boelter` is the usual analogue of
    heat transfer; it was fitted at Schmidt numbers up to 160, and the macromolecules of ultrafiltration have
    thousands: there it is an extrapolation. `harriott-hamilton` was measured on dissolving walls at Schmidt
    numbers from 432 to 97,600; `pinczewski-sideman` is for Schmidt numbers above 1000 (its Reynolds range is
    taken from the others).
    """
    (a, b, c), _, _ = TURBULENT[correlation]
    return a * reynolds**b * schmidt**c


@worksheet_function(
    result="sherwood",
    equation="Sh = 0.065 Re^0.875 Sc^0.25",
    source=SCHOCK_MIQUEL,
    fitted=[Fitted("reynolds", *SPACER_REYNOLDS)],
)
def sherwood_spacer(reynolds: Number, schmidt: Number) -> Number:
    """Sherwood number in a channel with a spacer.

    On the hydraulic diameter of hydraulic_diameter_spacer and the velocity between the filaments. The spacer
    renews the boundary layer, so the length does not matter. Fitted on feed spacers of spiral-wound elements;
    other nets differ by tens of per cent.
    """
    return 0.065 * reynolds**0.875 * schmidt**0.25


@worksheet_function(
    result="sherwood",
    equation="Sh = k r/D = b Re^0.567 Sc^0.33, Re = ρ ω r²/µ",
    source="Opong & Zydney, AIChE J. 37 (1991) 1497, after Smith, Colton, Merrill & Evans, Chem. Eng. Prog. "
           "Symp. Ser. 64 no. 84 (1968) 45; range: Colton & Smith, AIChE J. 18 (1972) 958",
    arguments={"reynolds": "Reynolds number of stirring, ρ ω r²/µ with the radius r of the cell",
               "coefficient": "Coefficient b of the cell and its stirrer"},
    fitted=[Fitted("reynolds", 8000.0, 32000.0)],
)
def sherwood_stirred(reynolds: Number, schmidt: Number, coefficient: Number = 0.23) -> Number:
    """Sherwood number at the membrane of a stirred cell, on the radius of the cell.

    Re and Sh take the radius of the cell, ω is the angular velocity in rad/s. The coefficient belongs to one
    geometry of cell and stirrer: fit it for another.
    """
    return coefficient * reynolds**0.567 * schmidt**0.33


@worksheet_function(
    result="sherwood",
    equation="Sh = a Re^b Sc^c (d/L)^e",
    source="power law with the user's own coefficients",
)
def sherwood_power(
    reynolds: Number,
    schmidt: Number,
    coefficient: Number,
    reynolds_exponent: Number,
    schmidt_exponent: Number,
    diameter_to_length: Number = 1.0,
    ratio_exponent: Number = 0.0,
) -> Number:
    """Sherwood number by any power law that has been fitted."""
    groups = reynolds**reynolds_exponent * schmidt**schmidt_exponent
    return coefficient * groups * diameter_to_length**ratio_exponent


@worksheet_function(
    result="mass_transfer_coefficient",
    equation="k = (Sh D/d_h)·(µ_b/µ_w)^0.14",
    source="definition of Sh; viscosity ratio: Sieder & Tate, Ind. Eng. Chem. 28 (1936) 1429",
    arguments={"hydraulic_diameter": "Diameter, or other length, that the Sherwood number is on"},
    fitted=[Fitted("bulk_to_wall_viscosity", 0.0044, 9.75)],
)
def transfer_coefficient(
    sherwood: Number,
    diffusion_coefficient: Number,
    hydraulic_diameter: Number,
    bulk_to_wall_viscosity: Number = 1.0,
) -> Number:
    """Mass-transfer coefficient from a Sherwood number.

    The correction for a viscous boundary layer was found in heat transfer; its exponent in ultrafiltration is
    disputed.
    """
    return sherwood * diffusion_coefficient / hydraulic_diameter * bulk_to_wall_viscosity**0.14


def _transfer(velocity, diameter, length, diffusion_coefficient, viscosity, density, correlation, channel):
    """Mass-transfer coefficient of a smooth channel, by the flow's regime."""
    sc = schmidt_number(viscosity, density, diffusion_coefficient)
    sherwood = blended(reynolds_number(velocity, diameter, density, viscosity),
                       lambda re: _graetz.average(graetz_number(re, sc, diameter, length), channel),
                       lambda re: sherwood_turbulent(re, sc, correlation))
    return sherwood * diffusion_coefficient / diameter


def _of_tube(test):
    """A condition on the Reynolds number and the correlation, in the arguments of transfer_tube."""
    return lambda velocity, tube_diameter, viscosity, density, correlation: test(
        reynolds_number(velocity, tube_diameter, density, viscosity), correlation)


def _of_slit(test):
    """The same in the arguments of transfer_slit."""
    return lambda velocity, channel_height, viscosity, density, correlation: test(
        reynolds_number(velocity, 2.0 * channel_height, density, viscosity), correlation)


def _branch_ranges(of) -> list[Fitted]:
    """The fitted ranges of the turbulent branch; their names tell it, as remarks give way to cautions."""
    found = []
    for name, (_, re_range, sc_range) in TURBULENT.items():
        turbulent = of(lambda re, chosen, name=name: chosen == name and re >= TURBULENT_ABOVE)
        used = of(lambda re, chosen, name=name: chosen == name and re > LAMINAR_BELOW)
        branch = f"turbulent branch, {name}:"
        found += [Fitted(f"{branch} Reynolds number", *re_range, value=of(lambda re, _: re), when=turbulent),
                  Fitted(f"{branch} Schmidt number", *sc_range, value=schmidt_number, when=used)]
    return found


def _branch_caution(of) -> list[Rule]:
    return [Rule(of(lambda re, _: LAMINAR_BELOW < re < TURBULENT_ABOVE),
                 "transition, Reynolds number between 2100 and 4000: interpolated between the laminar and "
                 "the turbulent branch")]


def _branch_remarks(of) -> list[Rule]:
    return [Rule(of(lambda re, _: re <= LAMINAR_BELOW),
                 "laminar branch, Reynolds number below 2100: exact Graetz average"),
            Rule(of(lambda re, _: re >= TURBULENT_ABOVE),
                 "turbulent branch, Reynolds number above 4000: the correlation")]


@worksheet_function(
    result="mass_transfer_coefficient",
    equation="k = Sh D/d; Re < 2100 exact Graetz average, Re > 4000 the correlation, between linear in "
             "ln Re, ln Sh",
    source=f"{GRAETZ}; {TURBULENT_SOURCE}; the transition is this library's own",
    choices={"correlation": tuple(TURBULENT)},
    names=CORRELATION_MEANING,
    arguments={"viscosity": CHANNEL_VISCOSITY},
    fitted=_branch_ranges(_of_tube),
    cautions=_branch_caution(_of_tube),
    remarks=_branch_remarks(_of_tube),
)
def transfer_tube(
    velocity: Number,
    tube_diameter: Number,
    channel_length: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
    correlation: str = "dittus-boelter",
) -> Number:
    """Average mass-transfer coefficient in a tube or a fiber's lumen, laminar or turbulent.

    Laminar: sherwood_graetz over the length. Turbulent: sherwood_turbulent, whatever the length. Between
    Reynolds numbers of 2100 and 4000 a straight line in logarithms joins the two, so that the value is
    continuous.
    """
    return _transfer(velocity, tube_diameter, channel_length, diffusion_coefficient, viscosity, density,
                     correlation, _graetz.TUBE)


@worksheet_function(
    result="mass_transfer_coefficient",
    equation="k = Sh D/(2h); Re < 2100 exact Graetz average, Re > 4000 the correlation, between linear in "
             "ln Re, ln Sh",
    source=f"{GRAETZ}; {TURBULENT_SOURCE}; the transition is this library's own",
    choices={"correlation": tuple(TURBULENT)},
    names=CORRELATION_MEANING,
    arguments={"viscosity": CHANNEL_VISCOSITY},
    fitted=_branch_ranges(_of_slit),
    cautions=_branch_caution(_of_slit),
    remarks=_branch_remarks(_of_slit),
)
def transfer_slit(
    velocity: Number,
    channel_height: Number,
    channel_length: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
    correlation: str = "dittus-boelter",
) -> Number:
    """Average mass-transfer coefficient in an open slit with membrane on both walls, laminar or turbulent.

    On the hydraulic diameter 2h of a channel much wider than high. Laminar: sherwood_graetz over the length.
    Turbulent: sherwood_turbulent, whatever the length. Between Reynolds numbers of 2100 and 4000 a straight
    line in logarithms joins the two.
    """
    return _transfer(velocity, 2.0 * channel_height, channel_length, diffusion_coefficient, viscosity,
                     density, correlation, _graetz.PLATES)


def spacer_reynolds(velocity, channel_height, spacer_voidage, filament_diameter, viscosity, density):
    """Reynolds number in a spacer-filled channel, in the arguments of the laws of spacers."""
    diameter = hydraulic_diameter_spacer(channel_height, spacer_voidage, filament_diameter)
    return reynolds_number(velocity, diameter, density, viscosity)


@worksheet_function(
    result="mass_transfer_coefficient",
    equation="k = 0.065 Re^0.875 Sc^0.25 D/d_h, Re = ρ u d_h/µ",
    source=SCHOCK_MIQUEL,
    arguments={"velocity": EFFECTIVE_VELOCITY, "viscosity": CHANNEL_VISCOSITY},
    fitted=[Fitted("Reynolds number", *SPACER_REYNOLDS, value=spacer_reynolds)],
)
def transfer_spacer(
    velocity: Number,
    channel_height: Number,
    spacer_voidage: Number,
    filament_diameter: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
) -> Number:
    """Mass-transfer coefficient in a channel with a spacer.

    On the hydraulic diameter of hydraulic_diameter_spacer; the length does not matter, since every filament
    renews the boundary layer.
    """
    diameter = hydraulic_diameter_spacer(channel_height, spacer_voidage, filament_diameter)
    sherwood = sherwood_spacer(reynolds_number(velocity, diameter, density, viscosity),
                               schmidt_number(viscosity, density, diffusion_coefficient))
    return sherwood * diffusion_coefficient / diameter


@worksheet_function(
    result="mass_transfer_coefficient",
    equation="k = 0.078 (r⁴/L)^⅓ γ",
    source="Zydney & Colton, A concentration polarization model for the filtrate flux in cross-flow "
           f"microfiltration of particulate suspensions, Chem. Eng. Commun. 47 (1986) 1; {BELFORT}",
    fitted=[Fitted("particle_radius", 0.5e-6, 30e-6)],
)
def transfer_shear_induced(shear_rate: Number, particle_radius: Number, channel_length: Number) -> Number:
    """Mass-transfer coefficient of particles that shear drives back from the membrane.

    Lévêque's average with the shear-induced diffusion coefficient 0.03 r² γ of suspensions (Eckstein, Bailey
    & Shapiro 1977), in place of the Brownian one: for particles of about 0.5 to 30 µm in laminar flow. Put it
    into flux_film with the volume fractions of bulk and packed layer; the coefficient was measured at volume
    fractions of 0.2 to 0.45.
    """
    return 0.078 * (particle_radius**4 / channel_length) ** (1.0 / 3.0) * shear_rate


@worksheet_function(
    result="flux",
    equation="J = 0.036 ρ r³ γ²/µ",
    source=f"{BELFORT}, after Drew, Schonberg & Belfort, Chem. Eng. Sci. 46 (1991) 3219",
    arguments={"viscosity": CHANNEL_VISCOSITY},
    cautions=[Rule(lambda shear_rate, particle_radius, density, viscosity:
                   density * shear_rate * particle_radius**2 / viscosity > 1.0,
                   "the Reynolds number of the particle, ρ γ r²/µ, exceeds 1: beyond the theory")],
)
def flux_inertial_lift(
    shear_rate: Number, particle_radius: Number, density: Number, viscosity: Number
) -> Number:
    """Flux at which inertial lift just holds particles off the membrane.

    Fast laminar flow of a dilute suspension, rigid spheres, thin layer on the membrane, particle Reynolds
    number below 1; it matters for particles above some tens of micrometres and high shear rates.
    """
    return 0.036 * density * particle_radius**3 * shear_rate**2 / viscosity
