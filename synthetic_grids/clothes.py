"""Model clothes: the truth of a grid dressed up as files people really get.

Gridcarb must get the truth back. So the dressing uses the definitions themselves: TEOS-10 for the kinds of temperature,
one stated density for tracers per volume. Absolute salinity is the reference salinity (35.16504 / 35) g/kg per unit of
practical salinity: the invented ocean has the composition of standard sea water, and the anomaly atlas of the Earth
does not apply to it.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Literal

import gsw
import numpy as np
import xarray as xr

FILL = 1e20
GRAMS_PER_PRACTICAL = 35.16504 / 35.0

KINDS_OF_TEMPERATURE = {
    "in situ": "sea_water_temperature",
    "potential": "sea_water_potential_temperature",
    "conservative": "sea_water_conservative_temperature",
}

KINDS_OF_SALINITY = {
    "unsaid": ("sea_water_salinity", "0.001", 1.0),
    "practical": ("sea_water_practical_salinity", "1", 1.0),
    "absolute": ("sea_water_absolute_salinity", "g kg-1", GRAMS_PER_PRACTICAL),
}
"""Standard name, units and factor from practical salinity."""

PER_VOLUME = {
    "dic": "mole_concentration_of_dissolved_inorganic_carbon_in_sea_water",
    "alkalinity": "sea_water_alkalinity_expressed_as_mole_equivalent",
    "phosphate": "mole_concentration_of_phosphate_in_sea_water",
    "silicate": "mole_concentration_of_silicate_in_sea_water",
}

PER_MASS = {
    "dic": "moles_of_dissolved_inorganic_carbon_per_unit_mass_in_sea_water",
    "alkalinity": "sea_water_alkalinity_per_unit_mass_expressed_as_mole_equivalent",
    "phosphate": "moles_of_phosphate_per_unit_mass_in_sea_water",
    "silicate": "moles_of_silicate_per_unit_mass_in_sea_water",
}

MODEL_NAMES = {
    "temperature": "thetao", "salinity": "so", "dic": "dissic", "alkalinity": "talk", "phosphate": "po4", "silicate": "si",
}

LONG_NAMES = {
    "temperature": "sea water temperature", "salinity": "sea water salinity", "dic": "dissolved inorganic carbon",
    "alkalinity": "total alkalinity", "phosphate": "dissolved phosphate", "silicate": "dissolved silicate",
}

ROUNDING = {"temperature": 2.0**-5, "salinity": 2.0**-7, "dic": 2.0**-11, "alkalinity": 2.0**-10, "phosphate": 2.0**-14,
            "silicate": 2.0**-10}
"""Steps the committed files are rounded to, in K, 1 and mol m-3: well below what matters, and far easier to compress."""


@dataclass(frozen=True)
class Clothes:
    """What the files look like.

    names : variable names by tracer key.
    temperature, kelvin : kind and unit of temperature.
    salinity : `sea_water_salinity` in 0.001 leaves the scale unsaid and means practical; the others say theirs.
    tracer_units : units of carbon, alkalinity and nutrients; per volume needs `density`.
    density : kg m-3, the one density of all tracers per volume.
    rounding : step each variable is rounded to, in its own units; not rounded where absent.
    precision : type of the numbers and of their fill value, 1e20.
    """

    names: Mapping[str, str] = field(default_factory=lambda: dict(MODEL_NAMES))
    temperature: Literal["in situ", "potential", "conservative"] = "potential"
    kelvin: bool = False
    salinity: Literal["unsaid", "practical", "absolute"] = "unsaid"
    tracer_units: Literal["mol m-3", "mmol m-3", "umol kg-1"] = "mol m-3"
    density: float = 1026.0
    rounding: Mapping[str, float] = field(default_factory=dict)
    precision: Literal["float32", "float64"] = "float32"


def _temperature(
    truth: xr.Dataset, depth: xr.DataArray, latitude: xr.DataArray, clothes: Clothes
) -> tuple[xr.DataArray, str, str]:
    """Temperature in its clothes, with standard name and units."""
    values = truth["temperature"]
    if clothes.temperature != "in situ":
        pressure = gsw.p_from_z(-depth, latitude)
        convert = gsw.pt0_from_t if clothes.temperature == "potential" else gsw.CT_from_t
        absolute = GRAMS_PER_PRACTICAL * truth["salinity"]
        values = xr.apply_ufunc(convert, absolute, values, pressure)
    standard_name = KINDS_OF_TEMPERATURE[clothes.temperature]
    return (values + 273.15, standard_name, "K") if clothes.kelvin else (values, standard_name, "degC")


def _tracer(key: str, values: xr.DataArray, clothes: Clothes) -> tuple[xr.DataArray, str, str]:
    """Salinity, carbon, alkalinity or a nutrient in its clothes, with standard name and units."""
    if key == "salinity":
        standard_name, units, factor = KINDS_OF_SALINITY[clothes.salinity]
        return factor * values, standard_name, units
    if clothes.tracer_units == "umol kg-1":
        return values, PER_MASS[key], clothes.tracer_units
    factor = clothes.density * (1e-6 if clothes.tracer_units == "mol m-3" else 1e-3)
    return factor * values, PER_VOLUME[key], clothes.tracer_units


def filled(
    values: xr.DataArray, attributes: Mapping[str, object], precision: Literal["float32", "float64"] = "float32"
) -> xr.Variable:
    """The values in a precision, missing ones replaced by 1e20 of the same type, with the attributes that say so."""
    fill = np.dtype(precision).type(FILL)
    numbers = np.where(np.isnan(values.values), fill, values.values.astype(precision))
    return xr.Variable(values.dims, numbers, {**attributes, "_FillValue": fill, "missing_value": fill})


def dress(truth: xr.Dataset, depth: xr.DataArray, latitude: xr.DataArray, clothes: Clothes) -> xr.Dataset:
    """The tracers of `grids.sample` as model variables with CF attributes and fill values; dims and coords stay.

    `depth` in m (positive down) and `latitude` in degrees north give the pressure the kinds of temperature need.
    """
    found = {}
    for key, name in clothes.names.items():
        if key == "temperature":
            values, standard_name, units = _temperature(truth, depth, latitude, clothes)
        else:
            values, standard_name, units = _tracer(key, truth[key], clothes)
        step = clothes.rounding.get(key)
        if step:
            values = (values / step).round() * step
        attributes = {"standard_name": standard_name, "long_name": LONG_NAMES[key], "units": units}
        if key == "temperature":
            attributes["units_metadata"] = "temperature: on_scale"
        found[name] = filled(values.transpose(*truth[key].dims), attributes, clothes.precision)
    return xr.Dataset(found, truth.coords)


def write(dataset: xr.Dataset, path: Path, split: Sequence[str] = ()) -> None:
    """Write a NetCDF-4 file exactly as the dataset stands (attributes include the fill values), deflated.

    A chunk holds whole dims, single steps of those in `split`. Coordinates and bounds carry no fill value. The file is
    written aside and renamed: the library would delete one that somebody is reading, and then refuse to write it.
    """
    encoding: dict[str, dict[str, object]] = {}
    for name, variable in dataset.variables.items():
        if "_FillValue" in variable.attrs:
            chunks = tuple(1 if dim in split else size for dim, size in variable.sizes.items())
            encoding[str(name)] = {"zlib": True, "complevel": 9, "shuffle": True, "chunksizes": chunks}
        else:
            encoding[str(name)] = {"_FillValue": None}
    aside = path.with_suffix(".partial")
    dataset.to_netcdf(aside, engine="netcdf4", format="NETCDF4", encoding=encoding)
    aside.replace(path)
