"""Crossflow: channels and fibers, their velocities, Reynolds and Schmidt numbers, and shear rates."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np

from ..declaration import Number, Rule, worksheet_function

BIRD = "Bird, Stewart & Lightfoot, Transport Phenomena, 2nd ed., Wiley (2002)"
SCHOCK_MIQUEL = ("Schock & Miquel, Mass transfer and pressure loss in spiral wound modules, "
                 "Desalination 64 (1987) 339")
METZNER_REED = ("Metzner & Reed, Flow of non-Newtonian fluids: correlation of the laminar, transition, and "
                "turbulent-flow regions, AIChE J. 1 (1955) 434")
GEOMETRY = "geometry, no source"

EFFECTIVE_VELOCITY = "Velocity between the filaments, Q/(w h ε)"
CHANNEL_VISCOSITY = "Dynamic viscosity of the liquid in the channel"

#: Reynolds numbers between which flow in a smooth channel is neither surely laminar nor surely turbulent.
LAMINAR_BELOW = 2100.0
TURBULENT_ABOVE = 4000.0
_SPAN = math.log(TURBULENT_ABOVE / LAMINAR_BELOW)


def blended(reynolds: Number, laminar: Callable, turbulent: Callable) -> Number:
    """A law of laminar flow up to Re 2100, of turbulent flow from Re 4000, and a line in logarithms between.

    Both are functions of the Reynolds number at one geometry and one liquid. The line joins their values at
    2100 and 4000, so that the whole is continuous; it is this library's own, for want of a law of the
    transition.
    """
    if isinstance(reynolds, np.ndarray):
        held = np.minimum(np.maximum(reynolds, LAMINAR_BELOW), TURBULENT_ABOVE)
        share = np.log(held / LAMINAR_BELOW) / _SPAN
        low = laminar(np.minimum(reynolds, LAMINAR_BELOW))
        return low ** (1.0 - share) * turbulent(np.maximum(reynolds, TURBULENT_ABOVE)) ** share
    if reynolds <= LAMINAR_BELOW:
        return laminar(reynolds)
    if reynolds >= TURBULENT_ABOVE:
        return turbulent(reynolds)
    share = math.log(reynolds / LAMINAR_BELOW) / _SPAN
    return laminar(LAMINAR_BELOW) ** (1.0 - share) * turbulent(TURBULENT_ABOVE) ** share


@worksheet_function(result="hydraulic_diameter", equation="d_h = 2 h w/(h + w)",
                    source=f"four times the flow area over the wetted perimeter; {BIRD}")
def hydraulic_diameter_slit(channel_height: Number, channel_width: Number) -> Number:
    """Hydraulic diameter of a rectangular channel.

    For a channel much wider than high it is twice the height, which the laws of slits here take.
    """
    return 2.0 * channel_height * channel_width / (channel_height + channel_width)


@worksheet_function(result="hydraulic_diameter", equation="d_h = 4 ε/(2/h + (1 − ε)·4/d_f)",
                    source=SCHOCK_MIQUEL)
def hydraulic_diameter_spacer(
    channel_height: Number, spacer_voidage: Number, filament_diameter: Number
) -> Number:
    """Hydraulic diameter of a channel with a spacer: four times the void volume over the wetted surface.

    The wetted surface is both walls and that of the filaments, whose specific surface is 4/d_f for round
    ones. A voidage of 1 is the open slit, 2h.
    """
    return 4.0 * spacer_voidage / (2.0 / channel_height + (1.0 - spacer_voidage) * 4.0 / filament_diameter)


@worksheet_function(
    result="flow_area",
    equation="A_f = A h ε/(2 L)",
    source=GEOMETRY,
    arguments={"area": "Membrane area on both walls of the channels"},
)
def flow_area_spacer(
    area: Number, channel_length: Number, channel_height: Number, spacer_voidage: Number
) -> Number:
    """Open cross-section of spacer-filled channels from their membrane area.

    Both walls of a channel are membrane, so the width of all channels is A/(2L). `velocity` with this area is
    the effective one, between the filaments.
    """
    return area * channel_height * spacer_voidage / (2.0 * channel_length)


@worksheet_function(result="velocity", equation="u = Q/A_f", source=BIRD)
def velocity(flow: Number, flow_area: Number) -> Number:
    """Mean velocity from flow and open cross-section."""
    return flow / flow_area


@worksheet_function(
    result="reynolds",
    equation="Re = ρ u d_h/µ",
    source="Reynolds, Phil. Trans. R. Soc. London 174 (1883) 935",
    arguments={"viscosity": CHANNEL_VISCOSITY},
)
def reynolds(velocity: Number, hydraulic_diameter: Number, density: Number, viscosity: Number) -> Number:
    """Reynolds number of flow in a channel.

    Smooth channels without a spacer are laminar below about 2100 and turbulent above about 4000.
    """
    return density * velocity * hydraulic_diameter / viscosity


@worksheet_function(
    result="reynolds",
    equation="Re = ρ u^(2−n) d^n/(8^(n−1) K ((3n+1)/(4n))^n), shear stress K γ^n",
    source=METZNER_REED,
    cautions=[Rule(lambda result: result > LAMINAR_BELOW,
                   "the flow is not laminar: laws of Newtonian turbulent flow do not hold")],
    dimensional="the unit of the consistency depends on the flow index",
)
def reynolds_power_law(
    velocity: Number, hydraulic_diameter: Number, density: Number, consistency: Number, flow_index: Number
) -> Number:
    """Generalised Reynolds number of a power-law liquid in a round tube.

    Defined so that laminar flow has the friction factor 64/Re (Darcy) whatever the flow index; a flow index
    of 1 gives the ordinary Reynolds number with the consistency as viscosity. The consistency is that of the
    shear stress K γ^n, not the K′ of tube viscometers, which includes ((3n+1)/(4n))^n. For a slit it is an
    approximation.
    """
    n = flow_index
    shape = ((3.0 * n + 1.0) / (4.0 * n)) ** n * 8.0 ** (n - 1.0)
    return density * velocity ** (2.0 - n) * hydraulic_diameter**n / (consistency * shape)


@worksheet_function(
    result="schmidt",
    equation="Sc = µ/(ρ D)",
    source=BIRD,
    arguments={"viscosity": CHANNEL_VISCOSITY},
)
def schmidt(viscosity: Number, density: Number, diffusion_coefficient: Number) -> Number:
    """Schmidt number: how much thicker the boundary layer of velocity is than that of concentration."""
    return viscosity / (density * diffusion_coefficient)


@worksheet_function(result="shear_rate", equation="γ = 8 u/d", source=f"laminar flow in a round tube; {BIRD}")
def shear_rate_tube(velocity: Number, tube_diameter: Number) -> Number:
    """Shear rate at the wall of a round tube or a fiber's lumen.

    Laminar flow (Reynolds number below 2100) of a Newtonian liquid.
    """
    return 8.0 * velocity / tube_diameter


@worksheet_function(result="shear_rate", equation="γ = 6 u/h",
                    source=f"laminar flow between parallel plates; {BIRD}")
def shear_rate_slit(velocity: Number, channel_height: Number) -> Number:
    """Shear rate at the walls of a slit.

    Laminar flow (Reynolds number on 2h below 2100) of a Newtonian liquid, channel much wider than high, no
    spacer.
    """
    return 6.0 * velocity / channel_height


@worksheet_function(
    result="area",
    equation="A = n π d L",
    source=GEOMETRY,
    arguments={"fiber_diameter": "Diameter of the fiber on the face that the area is wanted on"},
)
def area_fiber(fiber_count: Number, fiber_diameter: Number, fiber_length: Number) -> Number:
    """Membrane area of a bundle of fibers.

    Give the inner diameter for inside-out filtration, the outer for outside-in, and the length between the
    pottings.
    """
    return fiber_count * math.pi * fiber_diameter * fiber_length


@worksheet_function(result="flux", equation="J_2 = J_1 d_1/d_2", source=GEOMETRY)
def flux_diameter(flux: Number, from_diameter: Number, to_diameter: Number) -> Number:
    """Flux on the other face of a fiber: the same flow per length on another circumference."""
    return flux * from_diameter / to_diameter
