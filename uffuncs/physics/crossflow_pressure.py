"""Crossflow: pressure loss in tubes, slits, channels with a spacer, and in the lumen of dead-end fibers."""

from __future__ import annotations

import math

import numpy as np

from ..declaration import Fitted, Number, Rule, worksheet_function
from .crossflow import (BIRD, CHANNEL_VISCOSITY, EFFECTIVE_VELOCITY, LAMINAR_BELOW, SCHOCK_MIQUEL,
                        TURBULENT_ABOVE, blended, hydraulic_diameter_spacer)
from .crossflow import reynolds as reynolds_number
from .crossflow_transfer import SPACER_REYNOLDS, spacer_reynolds

TOPIC = "crossflow"

BLASIUS = "Blasius, VDI Mitt. Forschungsarb. 131 (1913) 1"
BLASIUS_REYNOLDS = (3000.0, 1e5)


def _of_tube(test):
    """A condition on the Reynolds number, in the arguments of pressure_drop_tube."""
    return lambda velocity, tube_diameter, viscosity, density: test(
        reynolds_number(velocity, tube_diameter, density, viscosity))


def _of_slit(test):
    """The same in the arguments of pressure_drop_slit."""
    return lambda velocity, channel_height, viscosity, density: test(
        reynolds_number(velocity, 2.0 * channel_height, density, viscosity))


def _branches(of) -> dict:
    """Fitted range, caution and remarks of the three branches."""
    return dict(
        fitted=[Fitted("turbulent branch, Blasius: Reynolds number", *BLASIUS_REYNOLDS,
                       value=of(lambda re: re), when=of(lambda re: re >= TURBULENT_ABOVE))],
        cautions=[Rule(of(lambda re: LAMINAR_BELOW < re < TURBULENT_ABOVE),
                       "transition, Reynolds number between 2100 and 4000: interpolated between the laminar "
                       "and the turbulent branch")],
        remarks=[Rule(of(lambda re: re <= LAMINAR_BELOW), "laminar branch, Reynolds number below 2100"),
                 Rule(of(lambda re: re >= TURBULENT_ABOVE),
                      "turbulent branch, Reynolds number above 4000: Blasius")],
    )


def _pressure_drop(velocity, diameter, length, viscosity, density, laminar_factor):
    """Pressure loss in a smooth channel; Darcy's friction factor is laminar_factor/Re or Blasius's."""
    # With u = Re µ/(ρ d) the loss is f Re² times this, and f Re² has no division by a velocity of 0.
    unit = viscosity**2 * length / (2.0 * density * diameter**3)
    return unit * blended(reynolds_number(velocity, diameter, density, viscosity),
                          lambda re: laminar_factor * re,
                          lambda re: 0.316 * re**1.75)


@worksheet_function(
    result="pressure_drop",
    equation="Δp = 32 µ u L/d² (Re < 2100); 0.316 Re^-0.25 (L/d) ρ u²/2 (Re > 4000); between linear in "
             "ln Re, ln Δp",
    source=f"Hagen–Poiseuille, {BIRD}; {BLASIUS}; the transition is this library's own",
    arguments={"viscosity": CHANNEL_VISCOSITY},
    **_branches(_of_tube),
)
def pressure_drop_tube(
    velocity: Number, tube_diameter: Number, channel_length: Number, viscosity: Number, density: Number
) -> Number:
    """Pressure loss along a smooth tube or an open fiber's lumen, laminar or turbulent.

    Fully developed flow at one velocity: entrance, exit, fittings and the loss of flow through the membrane
    are left out (module_profile_tube takes the last into account).
    """
    return _pressure_drop(velocity, tube_diameter, channel_length, viscosity, density, 64.0)


@worksheet_function(
    result="pressure_drop",
    equation="Δp = 12 µ u L/h² (Re < 2100); 0.316 Re^-0.25 (L/2h) ρ u²/2 (Re > 4000), Re on 2h; between "
             "linear in ln Re, ln Δp",
    source=f"plane Poiseuille flow, {BIRD}; {BLASIUS}; the transition is this library's own",
    arguments={"viscosity": CHANNEL_VISCOSITY},
    **_branches(_of_slit),
)
def pressure_drop_slit(
    velocity: Number, channel_height: Number, channel_length: Number, viscosity: Number, density: Number
) -> Number:
    """Pressure loss along an open slit, laminar or turbulent.

    Channel much wider than high, on the hydraulic diameter 2h; fully developed flow at one velocity, entrance
    and exit left out.
    """
    return _pressure_drop(velocity, 2.0 * channel_height, channel_length, viscosity, density, 96.0)


@worksheet_function(
    result="pressure_drop",
    equation="Δp = f (L/d_h) ρ u²/2, f = 6.23 Re^-0.3 (Darcy)",
    source=SCHOCK_MIQUEL,
    arguments={"velocity": EFFECTIVE_VELOCITY, "viscosity": CHANNEL_VISCOSITY},
    fitted=[Fitted("Reynolds number", *SPACER_REYNOLDS, value=spacer_reynolds)],
)
def pressure_drop_spacer(
    velocity: Number,
    channel_height: Number,
    spacer_voidage: Number,
    filament_diameter: Number,
    channel_length: Number,
    viscosity: Number,
    density: Number,
) -> Number:
    """Pressure loss along a channel with a spacer.

    On the hydraulic diameter of hydraulic_diameter_spacer and the velocity between the filaments. The
    friction factor is Darcy's, four times Fanning's. Entrance, exit and the glue lines of an element are left
    out.
    """
    diameter = hydraulic_diameter_spacer(channel_height, spacer_voidage, filament_diameter)
    unit = viscosity**2 * channel_length / (2.0 * density * diameter**3)
    return unit * 6.23 * reynolds_number(velocity, diameter, density, viscosity) ** 1.7


@worksheet_function(
    result="pressure_drop",
    equation="Δp = (J/L_p) βL tanh(βL/2), β² = 128 µ L_p/d³",
    source="Hagen–Poiseuille with a permeable wall, derived here; compare Doshi, Gill & Kabadi, AIChE J. 23 "
           "(1977) 765, and Carroll & Booker, J. Membr. Sci. 168 (2000) 203",
    arguments={"flux": "Mean flux along the fiber, on the area of the lumen",
               "fiber_diameter": "Inner diameter of the fiber",
               "fiber_length": "Length from the open to the closed end; half the fiber if both are open",
               "viscosity": "Dynamic viscosity of the liquid in the lumen",
               "permeability": "Permeability, on the area of the lumen"},
)
def pressure_drop_fiber(
    flux: Number, fiber_diameter: Number, fiber_length: Number, viscosity: Number, permeability: Number
) -> Number:
    """Pressure loss along the lumen of a fiber that is closed at one end.

    Between the open and the closed end, whichever way the water flows: inside-out with the feed dead-end in
    the lumen, or outside-in with the permeate drawn off at the open end. Laminar flow of one viscosity, one
    permeability along the fiber, no osmotic pressure. For a permeability near 0 the flux is even and the loss
    is 64 µ J L²/d³.
    """
    stiffness = 128.0 * viscosity * fiber_length**2 / fiber_diameter**3
    return flux * stiffness * _tanh_half_over((stiffness * permeability) ** 0.5)


def _tanh_half_over(x: Number) -> Number:
    """tanh(x/2)/x, which goes to ½ as x goes to 0."""
    if isinstance(x, np.ndarray):
        held = np.maximum(x, 1e-4)
        return np.where(x < 1e-4, 0.5 - x * x / 24.0, np.tanh(0.5 * held) / held)
    return 0.5 - x * x / 24.0 if x < 1e-4 else math.tanh(0.5 * x) / x
