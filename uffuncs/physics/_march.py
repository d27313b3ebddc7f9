"""One pass along a module: the balances of water and solute and the pressure loss as differential equations.

An adaptive eighth-order Runge–Kutta method integrates them, whatever the number of points asked for. They are
written for s = (x/L)^⅓, in which the laminar entrance, where the mass-transfer coefficient goes to infinity
as x^(−⅓), is smooth.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import NoResult
from .crossflow import reynolds as reynolds_number
from .crossflow import schmidt as schmidt_number
from .osmotic_flux import flux_osmotic

#: Relative tolerance of a step, the absolute one on values that are 1 at the inlet, and the longest step in
#: s: a long one may step over the kinks at the Reynolds numbers where the laws change.
TOLERANCE, SMALL, LONGEST = 1e-11, 1e-13, 0.125
#: Evaluations after which it is given up: the usual module takes 150, one that is stiff because its flux dies
#: out at once would take millions.
MOST_EVALUATIONS = 6000
#: Share of the feed flow that counts as used up.
USED_UP = 1e-6
#: 1/Gz that stands for the inlet itself, where the local coefficient is infinite.
INLET = 1e-60

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(6)


@dataclass(frozen=True)
class Channels:
    """Parallel channels: sizes of all together, and the laws of one."""

    flow_area: float
    membrane_width: float  # membrane area per length
    length: float
    diameter: float  # hydraulic
    pressure_gradient: Callable[[float], float]  # of the velocity
    sherwood: Callable[[float, float, float], float]  # local, of Re, Sc and the 1/Gz passed since the inlet


@dataclass(frozen=True)
class Operation:
    """Feed, membrane and liquid."""

    feed_flow: float
    feed_concentration: float
    feed_pressure: float
    permeate_pressure: float
    permeability: float
    diffusion_coefficient: float
    viscosity: float
    density: float
    coefficients: tuple[float, float, float]
    intrinsic_rejection: float

    @cached_property
    def osmotic(self) -> bool:
        """Whether the solute slows the flux at all."""
        return self.feed_concentration > 0.0 and self.intrinsic_rejection > 0.0 and any(self.coefficients)

    def osmotic_difference(self, concentration: float) -> float:
        """Osmotic pressure between this concentration at the membrane and its permeate."""
        passed = (1.0 - self.intrinsic_rejection) * concentration
        b1, b2, b3 = self.coefficients
        return (concentration * (b1 + concentration * (b2 + concentration * b3))
                - passed * (b1 + passed * (b2 + passed * b3)))


class March:
    """The differential equations of one module, in numbers that are 1 at the inlet.

    State: flow, flow of solute, transmembrane pressure, and the 1/Gz passed, ∫D dx/(u d²), over its value at
    the end without permeation.
    """

    def __init__(self, channels: Channels, operation: Operation):
        self.channels, self.operation, self.evaluations = channels, operation, 0
        self.velocity = operation.feed_flow / channels.flow_area
        self.driving = operation.feed_pressure - operation.permeate_pressure
        self.schmidt = schmidt_number(operation.viscosity, operation.density, operation.diffusion_coefficient)
        self.passed = (operation.diffusion_coefficient * channels.length
                       / (self.velocity * channels.diameter**2))
        # 1 over the flux that takes the whole feed
        self.drain = channels.membrane_width * channels.length / operation.feed_flow

    def flux(self, flow: float, solute: float, pressure: float, passed: float) -> tuple[float, float, float]:
        """Local flux, bulk concentration and exp(−J/k)."""
        o, c = self.operation, self.channels
        u = self.velocity * flow
        re = reynolds_number(u, c.diameter, o.density, o.viscosity)
        sherwood = c.sherwood(re, self.schmidt, max(self.passed * passed, INLET))
        k = sherwood * o.diffusion_coefficient / c.diameter
        bulk = o.feed_concentration * solute / flow
        if o.osmotic:
            # Plain floats take its fast way, whatever numbers the caller gave.
            flux = flux_osmotic(*map(float, (self.driving * pressure, o.permeability, k, bulk,
                                             *o.coefficients, o.intrinsic_rejection, 1.0)))
            if flux != flux:
                raise NoResult("several fluxes, or none, satisfy the osmotic law at one place: its "
                               "coefficients bend it too far")
        else:
            flux = o.permeability * self.driving * pressure
        return flux, bulk, math.exp(-flux / k)

    def permeate_share(self, thinning: float) -> float:
        """Permeate over bulk concentration; `thinning` is exp(−J/k)."""
        r = self.operation.intrinsic_rejection
        return 0.0 if r == 1.0 else (1.0 - r) / (r * thinning + (1.0 - r))

    def surface_concentration(self, bulk: float, thinning: float) -> float:
        r = self.operation.intrinsic_rejection
        remaining = r * thinning + (1.0 - r)
        if bulk == 0.0:
            return 0.0
        if remaining < 1e-300:
            raise NoResult("the surface concentration is beyond all numbers: no osmotic pressure limits the "
                           "flux; give osmotic coefficients")
        return bulk / remaining

    def rates(self, s: float, state: np.ndarray) -> tuple[float, float, float, float]:
        """d(state)/ds at s = (x/L)^⅓; states that a trial step overshoots to are held inside."""
        self.evaluations += 1
        if self.evaluations > MOST_EVALUATIONS:
            raise NoResult("the flux dies out long before the outlet: far more membrane than the feed flow "
                           "can use")
        flow, solute, pressure, passed = state.tolist()
        flow, pressure = max(flow, 1e-9), max(pressure, 0.0)
        stretch = 3.0 * s * s
        flux, _, thinning = self.flux(flow, solute, pressure, passed)
        drained = stretch * self.drain * flux
        gradient = self.channels.pressure_gradient(self.velocity * flow)
        return (-drained, -drained * self.permeate_share(thinning) * solute / flow,
                -stretch * self.channels.length * gradient / self.driving, stretch / flow)

    def solved(self):
        """The state as a function of s, or NoResult with the reason and the place."""
        from scipy.integrate import solve_ivp

        endings = [
            (lambda s, y: y[0] - USED_UP, "the feed flow is used up"),
            (lambda s, y: y[2], "the pressure falls to the permeate pressure"),
        ]
        if self.operation.osmotic and self.operation.permeability > 0.0:
            endings.append((lambda s, y: self.net_driving(y),
                            "the flux falls to 0, as the osmotic pressure of the bulk reaches the "
                            "transmembrane pressure,"))
        for event, _ in endings:
            event.terminal = True
        found = solve_ivp(self.rates, (0.0, 1.0), [1.0, 1.0, 1.0, 0.0], method="DOP853", rtol=TOLERANCE,
                          atol=SMALL, max_step=LONGEST, dense_output=True, events=[e for e, _ in endings])
        for (_, text), places in zip(endings, found.t_events or []):
            if len(places):
                raise NoResult(f"{text} {self.channels.length * places[0]**3:.4g} m from the inlet, "
                               f"before the outlet at {self.channels.length:.4g} m")
        if not found.success:
            raise NoResult(f"the integration along the module failed: {found.message}")
        return found

    def net_driving(self, state: np.ndarray) -> float:
        """Transmembrane pressure less the osmotic pressure without polarization, over that at the inlet."""
        flow, solute, pressure, _ = map(float, state)
        bulk = self.operation.feed_concentration * solute / max(flow, 1e-9)
        return pressure - self.operation.osmotic_difference(bulk) / self.driving

    def rows(self, states: np.ndarray) -> np.ndarray:
        """Velocity, pressure, concentration, flux and surface concentration of each column of states."""
        rows = []
        for flow, solute, pressure, passed in states.T.tolist():
            flux, bulk, thinning = self.flux(flow, solute, pressure, passed)
            rows.append((self.velocity * flow, self.operation.permeate_pressure + self.driving * pressure,
                         bulk, flux, self.surface_concentration(bulk, thinning)))
        return np.array(rows).T


def profile(channels: Channels, operation: Operation, points: float) -> tuple[np.ndarray, ...]:
    """The columns of a module's profile: a row for each of the points, and a last one with the means.

    The flow of solute over the flow of water is the concentration at each point, and the mean flux is the
    loss of flow over the membrane area: both balances close to rounding. The other means are Gauss
    quadratures over the solver's steps.
    """
    o = operation
    driving = o.feed_pressure - o.permeate_pressure
    if o.feed_flow <= 0.0:
        raise NoResult("the feed flow is 0")
    if driving <= 0.0:
        raise NoResult("the feed pressure does not exceed the permeate pressure")
    if o.osmotic and o.permeability > 0.0 and o.osmotic_difference(o.feed_concentration) >= driving:
        raise NoResult("the osmotic pressure of the feed is not below the transmembrane pressure at the "
                       "inlet: the flux is 0")
    march = March(channels, operation)
    found = march.solved()
    share = np.linspace(0.0, 1.0, int(points))
    states = found.sol(np.cbrt(share))
    states[:, 0], states[:, -1] = found.y[:, 0], found.y[:, -1]
    rows = march.rows(states)

    half = 0.5 * np.diff(found.t)
    s = ((found.t[:-1] + half)[:, None] + half[:, None] * _NODES).ravel()
    weights = (half[:, None] * _WEIGHTS).ravel() * 3.0 * s * s
    means = march.rows(found.sol(s)) @ weights
    means[3] = (1.0 - states[0, -1]) / march.drain
    position = np.append(share, 1.0) * channels.length
    return (position, *np.column_stack([rows, means]))
