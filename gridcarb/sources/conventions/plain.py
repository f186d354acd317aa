"""Plain words of the trade, as climatologies and hand-made files use them."""

from __future__ import annotations

from gridcarb.sources.conventions import Convention, declare

declare(Convention(
    key="plain", title="plain words", order=4, attribute="name",
    words={
        "temperature": (
            "temperature", "temp", "theta", "ptemp", "potential_temperature", "conservative_temperature",
            "sea_water_temperature", "sst",
        ),
        "salinity": ("salinity", "sal", "psal", "practical_salinity", "absolute_salinity", "sss"),
        "dic": ("dic", "tco2", "ct", "dissolved_inorganic_carbon", "total_carbon"),
        "alkalinity": ("alkalinity", "total_alkalinity", "alk", "ta", "tot_alk"),
        "phosphate": ("phosphate", "phos", "dip"),
        "silicate": ("silicate", "silicic_acid", "silica", "dsi", "sioh4", "si_oh_4"),
    },
))
