"""Plain words of the trade, as climatologies and hand-made files use them."""

from __future__ import annotations

from gridcarb.sources.conventions import Convention, declare

declare(Convention(
    key="plain", title="plain words", order=4, attribute="name",
    words={
        "temperature": (
            "temperature", "temp", "theta", "ptemp", "potential_temperature", "conservative_temperature",
            "sea_water_temperature", "sst", "t_an", "tpot", "ctd_temperature", "pt",
        ),
        "salinity": ("salinity", "sal", "psal", "practical_salinity", "absolute_salinity", "sss", "s_an"),
        "dic": ("dic", "tco2", "ct", "dissolved_inorganic_carbon", "total_carbon", "sumco2", "totco2", "tcarbn"),
        "alkalinity": ("alkalinity", "total_alkalinity", "alk", "ta", "tot_alk", "at"),
        "phosphate": ("phosphate", "phos", "dip", "p_an", "phspht"),
        "silicate": ("silicate", "silicic_acid", "silica", "dsi", "sioh4", "si_oh_4", "i_an", "silcat"),
    },
))
