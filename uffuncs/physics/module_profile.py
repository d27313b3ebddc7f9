"""Profiles along a module: flow, pressure, concentration and flux from inlet to outlet, in one pass."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

from ..declaration import Fitted, Number, Rule, worksheet_function
from ..quantities import quantity
from . import _graetz
from ._march import Channels, Operation, profile
from .crossflow import (CHANNEL_VISCOSITY, LAMINAR_BELOW, SCHOCK_MIQUEL, TURBULENT_ABOVE, blended,
                        hydraulic_diameter_spacer)
from .crossflow import schmidt as schmidt_number
from .crossflow_pressure import (BLASIUS, BLASIUS_REYNOLDS, pressure_drop_slit, pressure_drop_spacer,
                                 pressure_drop_tube)
from .crossflow_transfer import (COLBURN, GRAETZ, SPACER_REYNOLDS, TURBULENT, sherwood_spacer,
                                 sherwood_turbulent, spacer_reynolds)

TOPIC = "crossflow"

_PRESSURE = replace(quantity("feed_pressure"), name="pressure", symbol="p",
                    meaning="Pressure in the channel, gauge")
_RESULTS = ["position", "velocity", _PRESSURE, "concentration", "flux", "surface_concentration"]
_EQUATION = ("dQ/dx = −w J; d(Q C)/dx = −w J C_p; dp/dx = −{loss}; J = L_p (p − p_p − [π(C_w) − π(C_p)]), "
             "C_w = C/(R e^(−J/k) + 1 − R), C_p = (1 − R) C_w; k: {transfer}")
_SMOOTH_EQUATION = _EQUATION.format(loss="UF_PRESSURE_DROP_{0}", transfer="d(x Sh)/dx of UF_TRANSFER_{0}")
_FILM_SOURCE = ("balances of water and solute; film model with osmotic pressure: Wijmans, Nakao & Smolders, "
                "Flux limitation in ultrafiltration: osmotic pressure model and gel layer model, "
                "J. Membr. Sci. 20 (1984) 115")
_ARGUMENTS = {
    "viscosity": f"{CHANNEL_VISCOSITY}, one value for the module",
    "density": "Density of the liquid, one value for the module",
    "permeability": "Permeability at the process temperature",
    "channel_count": "Number of parallel channels that share the feed flow",
    "points": "Number of points from the inlet to the outlet, both included",
}
_NOT_RUN_ON_UNITS = "the integration along the module is done in plain numbers"


def _no_osmotic_law(
    feed_concentration, intrinsic_rejection, first_coefficient, second_coefficient, third_coefficient
):
    osmotic = first_coefficient or second_coefficient or third_coefficient
    return feed_concentration > 0 and intrinsic_rejection > 0 and not osmotic


_CAUTIONS = [
    Rule(_no_osmotic_law, "no osmotic coefficient is given: the solute does not slow the flux, and nothing "
                          "limits its surface concentration"),
]


def _smooth_sherwood(channel: _graetz.Channel) -> Callable[[float, float, float], float]:
    """Local Sherwood number in a smooth channel.

    At another Reynolds number the same place has its 1/Gz in inverse proportion.
    """

    def local(reynolds: float, schmidt: float, passed: float) -> float:
        return blended(reynolds, lambda re: _graetz.local(passed * reynolds / re, channel),
                       lambda re: sherwood_turbulent(re, schmidt))

    return local


def _tube_reynolds(feed_flow, diameter, count, viscosity, density):
    """At the inlet of round channels."""
    return 4.0 * density * feed_flow / (math.pi * diameter * count * viscosity)


def _slit_reynolds(feed_flow, channel_width, channel_count, viscosity, density):
    """At the inlet of slits, on 2h."""
    return 2.0 * density * feed_flow / (channel_width * channel_count * viscosity)


def _of_tube(test):
    return lambda feed_flow, tube_diameter, channel_count, viscosity, density: test(
        _tube_reynolds(feed_flow, tube_diameter, channel_count, viscosity, density))


def _of_fiber(test):
    return lambda feed_flow, fiber_diameter, fiber_count, viscosity, density: test(
        _tube_reynolds(feed_flow, fiber_diameter, fiber_count, viscosity, density))


def _of_slit(test):
    return lambda feed_flow, channel_width, channel_count, viscosity, density: test(
        _slit_reynolds(feed_flow, channel_width, channel_count, viscosity, density))


def _smooth(of) -> dict:
    """Fitted ranges, cautions and remarks by the regime at the inlet."""
    _, re_range, sc_range = TURBULENT["dittus-boelter"]
    turbulent, not_laminar = of(lambda re: re >= TURBULENT_ABOVE), of(lambda re: re > LAMINAR_BELOW)
    number = of(lambda re: re)
    return dict(
        fitted=[Fitted("turbulent at the inlet, dittus-boelter: Reynolds number", *re_range,
                       value=number, when=turbulent),
                Fitted("not laminar at the inlet, dittus-boelter: Schmidt number", *sc_range,
                       value=schmidt_number, when=not_laminar),
                Fitted("turbulent at the inlet, Blasius: Reynolds number", *BLASIUS_REYNOLDS,
                       value=number, when=turbulent)],
        cautions=[*_CAUTIONS,
                  Rule(of(lambda re: LAMINAR_BELOW < re < TURBULENT_ABOVE),
                       "the Reynolds number at the inlet is between 2100 and 4000: interpolated")],
        remarks=[Rule(of(lambda re: re <= LAMINAR_BELOW), "laminar at the inlet"),
                 Rule(turbulent, "turbulent at the inlet")],
    )


def _tubes(diameter, length, count, viscosity, density) -> Channels:
    return Channels(
        flow_area=count * 0.25 * math.pi * diameter**2,
        membrane_width=count * math.pi * diameter,
        length=length,
        diameter=diameter,
        pressure_gradient=lambda u: pressure_drop_tube(u, diameter, 1.0, viscosity, density),
        sherwood=_smooth_sherwood(_graetz.TUBE),
    )


@worksheet_function(
    results=_RESULTS,
    equation=_SMOOTH_EQUATION.format("TUBE"),
    source=f"{_FILM_SOURCE}; {GRAETZ}; {COLBURN}; {BLASIUS}",
    arguments=_ARGUMENTS,
    dimensional=_NOT_RUN_ON_UNITS,
    **_smooth(_of_tube),
)
def module_profile_tube(
    feed_flow: Number,
    feed_concentration: Number,
    feed_pressure: Number,
    permeate_pressure: Number,
    tube_diameter: Number,
    channel_length: Number,
    channel_count: Number,
    permeability: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    points: Number = 20,
) -> tuple:
    """Profile along tubular membranes; rows from inlet to outlet, then the means along the length.

    At each place the flux is that of the osmotic film model with the local pressure, bulk concentration and
    mass-transfer coefficient. The pressure loss follows the local velocity. Laminar flow: the concentration
    layer grows from the inlet, so the coefficient is the local one, d(x Sh)/dx of the exact average at the
    contact time ∫dx/u, infinite at the inlet, where the surface has the feed's concentration; turbulent flow
    (dittus-boelter) does not depend on the place, and the transition is blended as in transfer_tube. Constant
    density, viscosity, permeability, rejection and permeate pressure; no diffusion along the tube. The last
    row has the length as its position and the means along it; mean flux times membrane area is the permeate
    flow, and water and solute balance to 1e-9. The integration error is below 1e-8 of each value, whatever
    the points. No result if the flow is used up, the pressure falls to the permeate's or the flux to 0 before
    the outlet.
    """
    channels = _tubes(tube_diameter, channel_length, channel_count, viscosity, density)
    operation = Operation(
        feed_flow, feed_concentration, feed_pressure, permeate_pressure, permeability, diffusion_coefficient,
        viscosity, density, (first_coefficient, second_coefficient, third_coefficient), intrinsic_rejection)
    return profile(channels, operation, points)


@worksheet_function(
    results=_RESULTS,
    equation=_SMOOTH_EQUATION.format("SLIT"),
    source=f"{_FILM_SOURCE}; {GRAETZ}; {COLBURN}; {BLASIUS}",
    arguments=_ARGUMENTS,
    dimensional=_NOT_RUN_ON_UNITS,
    **_smooth(_of_slit),
)
def module_profile_slit(
    feed_flow: Number,
    feed_concentration: Number,
    feed_pressure: Number,
    permeate_pressure: Number,
    channel_height: Number,
    channel_width: Number,
    channel_length: Number,
    channel_count: Number,
    permeability: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    points: Number = 20,
) -> tuple:
    """Profile along open slits; rows from inlet to outlet, then the means along the length.

    Both walls of a slit are membrane: the area is 2 w L for each channel. Otherwise as module_profile_tube,
    with the laws of slits on the hydraulic diameter 2h.
    """
    channels = Channels(
        flow_area=channel_count * channel_width * channel_height,
        membrane_width=2.0 * channel_count * channel_width,
        length=channel_length,
        diameter=2.0 * channel_height,
        pressure_gradient=lambda u: pressure_drop_slit(u, channel_height, 1.0, viscosity, density),
        sherwood=_smooth_sherwood(_graetz.PLATES),
    )
    operation = Operation(
        feed_flow, feed_concentration, feed_pressure, permeate_pressure, permeability, diffusion_coefficient,
        viscosity, density, (first_coefficient, second_coefficient, third_coefficient), intrinsic_rejection)
    return profile(channels, operation, points)


def _inlet_reynolds(
    feed_flow, channel_height, channel_width, spacer_voidage, filament_diameter, channel_count, viscosity,
    density
):
    """At the inlet of spacer-filled channels."""
    velocity = feed_flow / (channel_count * channel_width * channel_height * spacer_voidage)
    return spacer_reynolds(velocity, channel_height, spacer_voidage, filament_diameter, viscosity, density)


@worksheet_function(
    results=_RESULTS,
    equation=_EQUATION.format(loss="UF_PRESSURE_DROP_SPACER", transfer="UF_TRANSFER_SPACER"),
    source=f"{_FILM_SOURCE}; {SCHOCK_MIQUEL}",
    arguments=_ARGUMENTS,
    dimensional=_NOT_RUN_ON_UNITS,
    fitted=[Fitted("Reynolds number at the inlet", *SPACER_REYNOLDS, value=_inlet_reynolds)],
    cautions=_CAUTIONS,
)
def module_profile_spacer(
    feed_flow: Number,
    feed_concentration: Number,
    feed_pressure: Number,
    permeate_pressure: Number,
    channel_height: Number,
    channel_width: Number,
    spacer_voidage: Number,
    filament_diameter: Number,
    channel_length: Number,
    channel_count: Number,
    permeability: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    points: Number = 20,
) -> tuple:
    """Profile along channels with a spacer; rows from inlet to outlet, then the means along the length.

    Both walls of a channel are membrane: the area is 2 w L for each channel; the velocity is that between the
    filaments. The laws of spacers hold at each place, with the local velocity. Otherwise as
    module_profile_tube.
    """
    diameter = hydraulic_diameter_spacer(channel_height, spacer_voidage, filament_diameter)
    channels = Channels(
        flow_area=channel_count * channel_width * channel_height * spacer_voidage,
        membrane_width=2.0 * channel_count * channel_width,
        length=channel_length,
        diameter=diameter,
        pressure_gradient=lambda u: pressure_drop_spacer(
            u, channel_height, spacer_voidage, filament_diameter, 1.0, viscosity, density),
        sherwood=lambda re, sc, passed: sherwood_spacer(re, sc),
    )
    operation = Operation(
        feed_flow, feed_concentration, feed_pressure, permeate_pressure, permeability, diffusion_coefficient,
        viscosity, density, (first_coefficient, second_coefficient, third_coefficient), intrinsic_rejection)
    return profile(channels, operation, points)


@worksheet_function(
    results=_RESULTS,
    equation=_SMOOTH_EQUATION.format("TUBE"),
    source=f"{_FILM_SOURCE}; {GRAETZ}; {COLBURN}; {BLASIUS}",
    arguments={**{k: v for k, v in _ARGUMENTS.items() if k != "channel_count"},
               "fiber_diameter": "Inner diameter of the fiber",
               "permeability": "Permeability at the process temperature, on the area of the lumen"},
    dimensional=_NOT_RUN_ON_UNITS,
    **_smooth(_of_fiber),
)
def module_profile_fiber(
    feed_flow: Number,
    feed_concentration: Number,
    feed_pressure: Number,
    permeate_pressure: Number,
    fiber_diameter: Number,
    fiber_length: Number,
    fiber_count: Number,
    permeability: Number,
    diffusion_coefficient: Number,
    viscosity: Number,
    density: Number,
    first_coefficient: Number,
    second_coefficient: Number = 0.0,
    third_coefficient: Number = 0.0,
    intrinsic_rejection: Number = 1.0,
    points: Number = 20,
) -> tuple:
    """Profile along the lumen of fibers; rows from inlet to outlet, then the means along the length.

    Crossflow through the lumen with an outlet at the far end; flux and permeability are on the area of the
    lumen. Otherwise as module_profile_tube.
    """
    channels = _tubes(fiber_diameter, fiber_length, fiber_count, viscosity, density)
    operation = Operation(
        feed_flow, feed_concentration, feed_pressure, permeate_pressure, permeability, diffusion_coefficient,
        viscosity, density, (first_coefficient, second_coefficient, third_coefficient), intrinsic_rejection)
    return profile(channels, operation, points)
