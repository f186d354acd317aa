"""Amounts in a volume of sea water (mol m-3), for those who compare with models that count so."""

from __future__ import annotations

from dataclasses import replace

import xarray as xr

from gridcarb.errors import OutputError
from gridcarb.fields import FIELDS, Field

_MOLES = {"umol kg-1": 1e-6, "mol kg-1": 1.0}
"""Units of an amount in a mass -> the same in mol kg-1."""

_DENSITIES = (980.0, 1080.0)
"""Densities, kg m-3, from fresh and hot water to the deepest trench: they widen the range thought sane."""


def per_volume_field(field: Field) -> Field:
    """The declaration of `field` as an amount in a volume; any other field comes back unchanged."""
    if field.units not in _MOLES:
        return field
    moles = _MOLES[field.units]
    ends = [end * moles * density for end in field.sane_range for density in _DENSITIES]
    middle = moles * 1025.0
    centre, limits = field.ink.centre, field.ink.limits
    ink = replace(
        field.ink, centre=None if centre is None else centre * middle,
        limits=limits and (limits[0] * middle, limits[1] * middle),
    )
    return replace(
        field, units="mol m-3", standard_name=field.volume_standard_name, volume_standard_name=None,
        sane_range=(min(ends), max(ends)), ink=ink, digits=field.digits + (3 if moles < 1 else 0),
    )


def per_volume(block: xr.Dataset, density: xr.DataArray | float | None) -> xr.Dataset:
    """`block` with every amount in a mass (umol kg-1, mol kg-1) turned into mol m-3; the rest as it was.

    density : of the input, kg m-3, a number or a field on the grid of `block`. Without one there is no volume: OutputError.
    """
    if density is None:
        raise OutputError(
            "amounts per volume need a density, and the input is per mass", where="output: amounts",
            mend="write `reading: {density: 1025 kg m-3}` in the recipe, or `output: {amounts: per mass}`",
        )
    turned = {}
    for key, values in block.data_vars.items():
        moles = _MOLES.get(FIELDS[str(key)].units)
        if moles is not None:
            turned[key] = (values * (density * moles)).transpose(*values.dims).assign_attrs(values.attrs)
    return block.assign(turned)
