"""Standard names of the CF conventions; the kinds of temperature and salinity are told apart when they are read."""

from __future__ import annotations

from gridcarb.sources.conventions import Convention, declare

declare(Convention(
    key="cf", title="CF", order=1, attribute="standard_name",
    words={
        "temperature": (
            "sea_water_temperature", "sea_water_potential_temperature", "sea_water_conservative_temperature",
            "sea_surface_temperature",
        ),
        "salinity": (
            "sea_water_practical_salinity", "sea_water_absolute_salinity", "sea_water_preformed_salinity",
            "sea_water_salinity", "sea_surface_salinity",
        ),
        "dic": (
            "mole_concentration_of_dissolved_inorganic_carbon_in_sea_water",
            "moles_of_dissolved_inorganic_carbon_per_unit_mass_in_sea_water",
        ),
        "alkalinity": (
            "sea_water_alkalinity_expressed_as_mole_equivalent",
            "sea_water_alkalinity_per_unit_mass_expressed_as_mole_equivalent",
        ),
        "phosphate": (
            "mole_concentration_of_phosphate_in_sea_water", "moles_of_phosphate_per_unit_mass_in_sea_water",
            "mole_concentration_of_dissolved_inorganic_phosphorus_in_sea_water",
            "mass_concentration_of_phosphate_in_sea_water",
        ),
        "silicate": (
            "mole_concentration_of_silicate_in_sea_water", "moles_of_silicate_per_unit_mass_in_sea_water",
            "mole_concentration_of_dissolved_inorganic_silicon_in_sea_water",
            "mass_concentration_of_silicate_in_sea_water",
        ),
        "area": ("cell_area",),
        "volume": ("ocean_volume",),
        "thickness": ("cell_thickness",),
        "sea_fraction": ("sea_area_fraction",),
        "basin": ("region",),
        "sea_floor_depth": (
            "sea_floor_depth_below_geoid", "sea_floor_depth_below_mean_sea_level", "sea_floor_depth_below_sea_surface",
            "sea_floor_depth_below_reference_ellipsoid",
        ),
    },
))
