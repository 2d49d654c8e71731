"""Density of moist air, and how temperature and pressure change with height."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from pacing.units import GRAVITY_M_S2, ZERO_CELSIUS_K

Array = NDArray[np.float64]
Floats = float | Array

LAPSE_K_PER_M = 0.0065
"""Fall of temperature with height (Source: iso-2533)."""
DRY_AIR_J_PER_KG_K = 287.05287
"""Specific gas constant of dry air (Source: iso-2533)."""
PRESSURE_EXPONENT = GRAVITY_M_S2 / (LAPSE_K_PER_M * DRY_AIR_J_PER_KG_K)

_GAS_CONSTANT_J_PER_MOL_K = 8.314472
_DRY_AIR_KG_PER_MOL = 28.96546e-3
_WATER_DEFICIT = 0.3780


def lapsed_temperature_k(height_m: Floats, *, temperature_k: Floats, at_height_m: Floats) -> Array:
    """Air temperature at ``height_m``, from ``temperature_k`` at ``at_height_m``.

    Source: iso-2533 (6.5 K per km).
    """
    return np.asarray(
        np.asarray(temperature_k) - LAPSE_K_PER_M * (np.asarray(height_m) - np.asarray(at_height_m))
    )


def lapsed_pressure_pa(
    height_m: Floats,
    *,
    pressure_pa: Floats,
    at_height_m: Floats,
    temperature_k: Floats,
    temperature_at_height_m: Floats,
) -> Array:
    """Air pressure at ``height_m``, from ``pressure_pa`` at ``at_height_m``.

    The column between is the actual one, through ``temperature_k`` at
    ``temperature_at_height_m``; a mean-sea-level pressure is given at height 0. Heights are
    taken as geopotential (0.02 % of density at 3 km).

    Source: iso-2533 (equation for a layer with a constant lapse).
    """
    column = {"temperature_k": temperature_k, "at_height_m": temperature_at_height_m}
    here = lapsed_temperature_k(height_m, **column)
    there = lapsed_temperature_k(at_height_m, **column)
    return np.asarray(np.asarray(pressure_pa) * (here / there) ** PRESSURE_EXPONENT)


def moist_air_density_kg_m3(
    *, temperature_k: Floats, pressure_pa: Floats, relative_humidity: Floats
) -> Array:
    """Density of moist air; ``relative_humidity`` from 0 to 1, arrays of one shape or broadcast.

    The carbon dioxide fraction is taken as 400 ppm. Published for 15 to 27 °C and 600 to
    1100 hPa; outside, the formula stays within 0.1 % of the ideal gas.

    Source: cipm-2007 (equations 1, A1.1 to A1.4).
    """
    kelvin = np.asarray(temperature_k, dtype=float)
    pascal = np.asarray(pressure_pa, dtype=float)
    celsius = kelvin - ZERO_CELSIUS_K
    # A1.1: vapour pressure at saturation, A1.2: enhancement factor, A1.3: mole fraction
    saturation_pa = np.exp(
        1.2378847e-5 * kelvin**2 - 1.9121316e-2 * kelvin + 33.93711047 - 6.3431645e3 / kelvin
    )
    enhancement = 1.00062 + 3.14e-8 * pascal + 5.6e-7 * celsius**2
    vapour = np.asarray(relative_humidity) * enhancement * saturation_pa / pascal
    # A1.4: compressibility
    ratio = pascal / kelvin
    virial = (
        1.58123e-6
        - 2.9331e-8 * celsius
        + 1.1043e-10 * celsius**2
        + (5.707e-6 - 2.051e-8 * celsius) * vapour
        + (1.9898e-4 - 2.376e-6 * celsius) * vapour**2
    )
    compressibility = 1.0 - ratio * virial + ratio**2 * (1.83e-11 - 0.765e-8 * vapour**2)
    dry = ratio * _DRY_AIR_KG_PER_MOL / (compressibility * _GAS_CONSTANT_J_PER_MOL_K)
    return np.asarray(dry * (1.0 - _WATER_DEFICIT * vapour))
