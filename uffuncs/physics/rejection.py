"""Rejection and sieving: observed and intrinsic, by pore theory, and as log removal."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import numpy as np

from ..declaration import Column, Number, Rule, worksheet_function
from ..errors import NotAvailable
from ..quantities import quantity
from ._line import fit_line

IUPAC = ("Koros, Ma & Shimidzu, Terminology for membranes and membrane processes "
         "(IUPAC Recommendations 1996), Pure Appl. Chem. 68 (1996) 1479")
OPONG_ZYDNEY = ("Opong & Zydney, Diffusive and convective protein transport through asymmetric membranes, "
                "AIChE J. 37 (1991) 1497")
FERRY = "Ferry, Statistical evaluation of sieve constants in ultrafiltration, J. Gen. Physiol. 20 (1936) 95"
ZEMAN_WALES = ("Zeman & Wales, Polymer solute rejection by ultrafiltration membranes, in Turbak (ed.), "
               "Synthetic Membranes vol. II, ACS Symp. Ser. 154 (1981) 411")
DECHADILOK_DEEN = ("Dechadilok & Deen, Hindrance factors for diffusion and convection in pores, "
                   "Ind. Eng. Chem. Res. 45 (2006) 6953")
MAVROVOUNIOTIS_BRENNER = (
    "Mavrovouniotis & Brenner, Hindered sedimentation, diffusion, and dispersion coefficients for Brownian "
    "spheres in circular cylindrical pores, J. Colloid Interface Sci. 124 (1988) 269")
ZYDNEY_LOG_NORMAL = ("Zydney, Aimar, Meireles, Pimbley & Belfort, Use of the log-normal probability density "
                     "function to analyze membrane pore size distributions, J. Membr. Sci. 91 (1994) 293")
DEEN = "Deen, Hindered transport of large molecules in liquid-filled pores, AIChE J. 33 (1987) 1409"
NG_LUNDBLAD_MITRA = ("Ng, Lundblad & Mitra, Optimization of solute separation by diafiltration, "
                     "Sep. Sci. 11 (1976) 499")
PORE_SHAPES = ("cylinder", "slit")
LARGEST_EXPONENT = 700.0  # e^-700 is still a number: beyond it the limit is reached to every digit

CONCENTRATED = Rule(
    lambda feed_concentration, permeate_concentration: permeate_concentration > feed_concentration,
    "the permeate is more concentrated than the feed: {permeate_concentration}, {feed_concentration}")
NO_FEED = Rule(lambda feed_concentration: feed_concentration == 0,
               "the feed concentration is 0: there is nothing to reject")


@worksheet_function(
    result=replace(quantity("rejection"), low=-1e300),
    equation="R = 1 − C_p/C_b",
    source=IUPAC,
    refuses=[NO_FEED],
    cautions=[CONCENTRATED],
)
def rejection_observed(feed_concentration: Number, permeate_concentration: Number) -> Number:
    """Observed rejection from the concentrations of feed and permeate.

    Local and momentary: both samples at one place and time. A module's feed and mixed permeate give an
    apparent value that falls with recovery.
    """
    return 1.0 - permeate_concentration / feed_concentration


@worksheet_function(
    result=replace(quantity("sieving_coefficient"), high=1e300),
    equation="S = C_p/C_b = 1 − R",
    source=IUPAC,
    refuses=[NO_FEED],
    cautions=[CONCENTRATED],
)
def sieving_observed(feed_concentration: Number, permeate_concentration: Number) -> Number:
    """Observed sieving coefficient from the concentrations of feed and permeate.

    1 minus the observed rejection; local and momentary like it.
    """
    return permeate_concentration / feed_concentration


def _decay(flux: Number, mass_transfer_coefficient: Number) -> Number:
    """e^(−J/k), never quite 0, so that rejections of 0 and 1 stay what they are; NaN for k = 0."""
    ratio = np.minimum(flux / mass_transfer_coefficient, LARGEST_EXPONENT)
    return np.exp(-ratio) * np.where(mass_transfer_coefficient > 0, 1.0, np.nan)[()]


NO_TRANSFER = Rule(lambda mass_transfer_coefficient: mass_transfer_coefficient == 0,
                   "the mass-transfer coefficient is 0: the polarization has no limit")


@worksheet_function(
    result="intrinsic_rejection",
    equation="R_i/(1 − R_i) = e^(J/k) R_o/(1 − R_o), as R_i = R_o/(R_o + (1 − R_o) e^(−J/k))",
    source=f"film theory; {OPONG_ZYDNEY}",
    arguments={"rejection": "Observed rejection, 1 − C_p/C_b"},
    refuses=[NO_TRANSFER],
)
def rejection_intrinsic(rejection: Number, flux: Number, mass_transfer_coefficient: Number) -> Number:
    """Intrinsic rejection, at the membrane surface, from the observed rejection.

    Stagnant-film model of concentration polarization with constant properties. Observed rejections of 0 and
    1 stay 0 and 1. At a large J/k an error of k counts as its exponent: near J/k = 3 an error of 10 % in k
    changes R_i/(1 − R_i) by a third.
    """
    return rejection / (rejection + (1.0 - rejection) * _decay(flux, mass_transfer_coefficient))


@worksheet_function(
    result="rejection",
    equation="R_o/(1 − R_o) = e^(−J/k) R_i/(1 − R_i), as R_o = R_i e^(−J/k)/(R_i e^(−J/k) + 1 − R_i)",
    source=f"film theory; {OPONG_ZYDNEY}",
    arguments={"rejection": "Intrinsic rejection, 1 − C_p/C_w"},
    refuses=[NO_TRANSFER],
)
def rejection_from_intrinsic(rejection: Number, flux: Number, mass_transfer_coefficient: Number) -> Number:
    """Observed rejection from the intrinsic rejection; the inverse of rejection_intrinsic.

    Stagnant-film model of concentration polarization with constant properties.
    """
    passed = rejection * _decay(flux, mass_transfer_coefficient)
    return passed / (passed + (1.0 - rejection))


# --- pore theory ------------------------------------------------------------------------------------------


def _size_ratio(solute_radius: Number, pore_radius: Number) -> Number:
    """λ, and 1 for a solute that does not fit in."""
    return np.minimum(solute_radius / pore_radius, 1.0)


@worksheet_function(
    result="sieving_coefficient",
    equation="S = 2 (1 − λ)² − (1 − λ)⁴, λ = r_s/r_pore; 0 from λ = 1 on",
    source=FERRY,
)
def sieving_ferry(solute_radius: Number, pore_radius: Number) -> Number:
    """Sieving coefficient of spheres in cylindrical pores, by steric exclusion alone.

    Parabolic flow, and the spheres move with the liquid; no diffusion, no adsorption, no charge, one pore
    size.
    """
    open_share = (1.0 - _size_ratio(solute_radius, pore_radius)) ** 2
    return open_share * (2.0 - open_share)


@worksheet_function(
    result="sieving_coefficient",
    equation="S = [2 (1 − λ)² − (1 − λ)⁴] exp(−0.7146 λ²), λ = r_s/r_pore; 0 from λ = 1 on",
    source=ZEMAN_WALES,
)
def sieving_zeman_wales(solute_radius: Number, pore_radius: Number) -> Number:
    """Sieving coefficient of spheres in cylindrical pores, with the lag of the solute behind the liquid.

    Ferry's equation times an empirical lag; no diffusion, no adsorption, no charge, one pore size.
    """
    lam = _size_ratio(solute_radius, pore_radius)
    return sieving_ferry(solute_radius, pore_radius) * np.exp(-0.7146 * lam**2)


def _convection_cylinder(lam: Number) -> Number:
    numerator = 1.0 + lam * (3.867 + lam * (-1.907 - 0.834 * lam))
    return (1.0 - lam) ** 2 * numerator / (1.0 + lam * (1.867 - 0.741 * lam))


def _convection_slit(lam: Number) -> Number:
    w = 1.0 + lam**2 * (-3.02 + lam * (5.776 + lam * (-12.3675 + lam * (
        18.9775 + lam * (-15.2185 + lam * 4.8525)))))
    return np.maximum(w, 0.0) * (lam < 1.0)  # the polynomial ends at 0 but for rounding


@worksheet_function(
    result="sieving_coefficient",
    equation="cylinder: W = (1 − λ)² (1 + 3.867 λ − 1.907 λ² − 0.834 λ³)/(1 + 1.867 λ − 0.741 λ²); "
             "slit: W = 1 − 3.02 λ² + 5.776 λ³ − 12.3675 λ⁴ + 18.9775 λ⁵ − 15.2185 λ⁶ + 4.8525 λ⁷; "
             "λ = r_s/r_pore, 0 from λ = 1 on",
    source=f"{DECHADILOK_DEEN}, equation 18 (cylinder); coefficients of the slit not checked against the paper",
    choices={"pore_shape": PORE_SHAPES},
    names={"pore_shape": "Shape of the pores"},
)
def sieving_hindered(solute_radius: Number, pore_radius: Number, pore_shape: str = "cylinder") -> Number:
    """Sieving coefficient of spheres carried by the flow through pores, with hydrodynamic hindrance.

    Convection far outweighs diffusion in the pore (see sieving_peclet where it does not). Neutral spheres,
    dilute, one pore size. In a slit `pore_radius` is the half-width.
    """
    lam = _size_ratio(solute_radius, pore_radius)
    return _convection_slit(lam) if pore_shape == "slit" else _convection_cylinder(lam)


CONTACT = 0.95  # λ of the cylinder above which the asymptote for near contact stands in for the polynomial


@worksheet_function(
    result="hindrance_factor",
    equation="cylinder: H = 1 + (9/8) λ ln λ − 1.56034 λ + 0.528155 λ² + 1.91521 λ³ − 2.81903 λ⁴ "
             "+ 0.270788 λ⁵ + 1.10115 λ⁶ − 0.435933 λ⁷, above λ = 0.95 H = (1 − λ)² 0.984 ((1 − λ)/λ)^(5/2); "
             "slit: H = 1 + (9/16) λ ln λ − 1.19358 λ + 0.4285 λ³ − 0.3192 λ⁴ + 0.08428 λ⁵",
    source=f"{DECHADILOK_DEEN}, equation 16 (cylinder); above 0.95: {MAVROVOUNIOTIS_BRENNER}; "
           "coefficients of the slit not checked against the paper",
    choices={"pore_shape": PORE_SHAPES},
    names={"pore_shape": "Shape of the pores"},
    remarks=[Rule(lambda solute_radius, pore_radius, pore_shape:
                  pore_shape == "cylinder" and CONTACT < solute_radius / pore_radius < 1,
                  "the asymptote for near contact, above a ratio of radii of 0.95")],
)
def hindrance_diffusion(solute_radius: Number, pore_radius: Number, pore_shape: str = "cylinder") -> Number:
    """Diffusive hindrance factor of spheres in pores: partitioning times the drag ratio.

    The diffusive flux through a pore is H D ΔC/L on the concentrations outside. Neutral spheres, dilute,
    one pore size. In a slit `pore_radius` is the half-width. At λ = 0.95 the two branches of the cylinder
    meet within 1 %.
    """
    lam = _size_ratio(solute_radius, pore_radius)
    logarithm = lam * np.log(np.maximum(lam, 1e-300))
    if pore_shape == "slit":
        h = 1.0 + 9.0 / 16.0 * logarithm + lam * (
            -1.19358 + lam**2 * (0.4285 + lam * (-0.3192 + lam * 0.08428)))
        return np.maximum(h, 0.0) * (lam < 1.0)
    polynomial = 1.0 + 9.0 / 8.0 * logarithm + lam * (-1.56034 + lam * (0.528155 + lam * (1.91521 + lam * (
        -2.81903 + lam * (0.270788 + lam * (1.10115 - lam * 0.435933))))))
    near = np.maximum(lam, CONTACT)
    contact = (1.0 - near) ** 2 * 0.984 * ((1.0 - near) / near) ** 2.5
    return np.where(lam <= CONTACT, polynomial, contact)[()]


def _convection_diffusion(limit: Number, peclet: Number) -> Number:
    """W/(1 − (1 − W) e^(−Pe)) without loss of digits at small Pe; W = 0 stays 0 even at Pe = 0."""
    denominator = limit - (1.0 - limit) * np.expm1(-peclet)
    return limit / (denominator + (denominator == 0))


@worksheet_function(
    result="sieving_coefficient",
    equation="S = W/(1 − (1 − W) e^(−Pe)), Pe = W J l τ/(ε H D); W and H of the cylinder",
    source=f"{OPONG_ZYDNEY}; W and H: {DECHADILOK_DEEN}",
    arguments={"diffusion_coefficient": "Diffusion coefficient of the solute in the free liquid"},
)
def sieving_peclet(
    flux: Number,
    solute_radius: Number,
    pore_radius: Number,
    porosity: Number,
    tortuosity: Number,
    membrane_thickness: Number,
    diffusion_coefficient: Number,
) -> Number:
    """Sieving coefficient at the membrane surface, C_p/C_w, with convection and diffusion in the pores.

    Goes from 1 at no flux to the hindered convective value W at a high flux; 0 for a solute as large as the
    pore. Cylindrical pores of one size, neutral spheres, dilute; `membrane_thickness` is that of the
    separating skin.
    """
    w = sieving_hindered(solute_radius, pore_radius)
    h = hindrance_diffusion(solute_radius, pore_radius)
    blocked = w == 0
    pore_diffusion = porosity * (h + blocked) * diffusion_coefficient  # any number does where nothing passes
    return _convection_diffusion(w, w * flux * membrane_thickness * tortuosity / pore_diffusion)


NODES = 96  # of the quadrature: an error below 1e-10 for every spread from 1 to 10
REACH = 8.5  # standard deviations of a normal distribution that hold all but 1e-16 of it


@lru_cache(maxsize=1)
def _legendre() -> tuple[np.ndarray, np.ndarray]:
    """Nodes on 0…1, and their weights."""
    nodes, weights = np.polynomial.legendre.leggauss(NODES)
    return 0.5 * (nodes + 1.0), 0.5 * weights


@worksheet_function(
    result="sieving_coefficient",
    equation="S = ∫ n r⁴ W(r_s/r) dr/∫ n r⁴ dr, n log-normal: n r⁴ is log-normal about r_m exp(4 ln² σ_g)",
    source=f"{ZYDNEY_LOG_NORMAL}; W: {DECHADILOK_DEEN}",
    cautions=[Rule(lambda geometric_standard_deviation: geometric_standard_deviation > 3,
                   "{geometric_standard_deviation} is wide: the few widest pores carry nearly all flow")],
)
def sieving_pore_spread(
    solute_radius: Number, median_pore_radius: Number, geometric_standard_deviation: Number
) -> Number:
    """Sieving coefficient of a membrane with a log-normal spread of cylindrical pores.

    The number of pores is normal in ln r; each pore passes a flow by r⁴ (Hagen–Poiseuille, equal lengths)
    and sieves by the hindered convective W. Half of the flow goes through pores wider than r_m exp(4 ln²
    σ_g): 1.93 r_m at σ_g = 1.5. A spread of 1 is one pore size.
    """
    spread = np.maximum(np.log(geometric_standard_deviation), 1e-30)
    ratio = np.maximum(solute_radius / (median_pore_radius * np.exp(4.0 * spread**2)), 1e-300)
    # z counts standard deviations from the median by flow; below z_1, at the kink of W, nothing fits in.
    z_1 = np.log(ratio) / spread
    low = np.maximum(z_1, -REACH)
    width = np.maximum(z_1, 0.0) + REACH - low
    nodes, weights = _legendre()
    z = np.asarray(low)[..., None] + np.asarray(width)[..., None] * nodes
    lam = np.minimum(np.asarray(ratio)[..., None] * np.exp(-np.asarray(spread)[..., None] * z), 1.0)
    density = np.exp(-0.5 * z**2) * (1.0 / np.sqrt(2.0 * np.pi))
    return np.minimum(width * ((_convection_cylinder(lam) * density) @ weights), 1.0)


@worksheet_function(
    result="sieving_coefficient",
    equation="C_p/C_w = K/(1 − (1 − K) e^(−Pe)), Pe = J/(D_pore/l)",
    source=f"convection and diffusion with equilibrium at both pore mouths, no further hindrance; {DEEN}",
    refuses=[Rule(lambda pore_transfer_coefficient: pore_transfer_coefficient == 0,
                  "the pore transfer coefficient is 0")],
)
def sieving_partition(
    flux: Number, partition_coefficient: Number, pore_transfer_coefficient: Number
) -> Number:
    """Sieving coefficient at the membrane surface with equilibrium partition at both pore mouths.

    1 at no flux, the partition coefficient K at a high flux, 0 for K = 0. The flux and D_pore/l are on the
    same area: D_pore includes porosity and tortuosity.
    """
    blocked = np.where(pore_transfer_coefficient > 0, 1.0, np.nan)[()]
    return _convection_diffusion(partition_coefficient, flux / pore_transfer_coefficient * blocked)


@worksheet_function(
    results=["sieving_coefficient", "standard_error", "coefficient_of_determination"],
    equation="ln C = ln C_0 − S N",
    source=NG_LUNDBLAD_MITRA,
    arguments={"concentration": "Concentration of the solute in the retentate"},
    dimensional="logarithm of a concentration, whose unit drops out of the slope",
)
def sieving_fit(diavolumes: Column, concentration: Column) -> tuple:
    """Sieving coefficient from a constant-volume diafiltration, its standard error, and r².

    Least squares of ln C in the retentate on the diavolumes N. Assumes a constant sieving coefficient and
    no loss other than through the membrane: adsorption or breakdown of the solute counts as sieving. A
    value below 0 or above 1 tells noise, or such a loss. Three points or more; r² is 0 where the
    concentration does not change at all.
    """
    if np.any(concentration <= 0):
        row = int(np.argmin(concentration)) + 1
        raise NotAvailable(f"the concentration is 0 in row {row}, its logarithm infinite; leave the row out")
    line = fit_line(diavolumes, np.log(concentration), "diavolumes")
    return -line.slope, line.slope_error, line.r_squared


@worksheet_function(
    result=replace(quantity("log_removal"), low=-60, high=340),
    equation="LRV = log10(N_f) − log10(max(N_p, N_d))",
    source="40 CFR 141.719(b)(2)(v); EPA 815-R-06-009, Membrane Filtration Guidance Manual (2005)",
    refuses=[
        Rule(lambda feed_count: feed_count == 0, "the feed count is 0: there is nothing to remove"),
        Rule(lambda permeate_count, detection_limit: permeate_count == 0 and detection_limit == 0,
             "the permeate count is 0; give the detection limit of the method, which then stands for it"),
    ],
    cautions=[Rule(lambda feed_count, permeate_count, detection_limit:
                   feed_count <= max(permeate_count, detection_limit),
                   "the feed count does not exceed permeate count and detection limit: no removal is shown")],
    remarks=[Rule(lambda permeate_count, detection_limit: permeate_count < detection_limit,
                  "nothing detected: {detection_limit} stands for the permeate count; "
                  "the true removal may be higher")],
)
def log_removal(feed_count: Number, permeate_count: Number, detection_limit: Number = 0.0) -> Number:
    """Log removal value from counts in feed and permeate.

    The counts are concentrations of organisms or particles in any one unit. A permeate count below the
    detection limit is set to it, so that nothing detected gives the removal that can be claimed at least.
    What removal is credited is set by the regulator.
    """
    counted = np.maximum(permeate_count, detection_limit)
    feed, permeate = (np.where(count > 0, count, np.nan) for count in (feed_count, counted))
    return np.log10(feed) - np.log10(permeate)
