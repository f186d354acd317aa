"""Names that ocean models in wide use give their tracers when nobody renames them."""

from __future__ import annotations

from gridcarb.sources.conventions import Convention, declare

declare(Convention(
    key="models", title="model output", order=3, attribute="name",
    words={
        "temperature": (
            "votemper", "toce", "toce_con", "toce_pot", "sosstsst", "templvl", "tho", "o_temp", "pottmp",
        ),
        "salinity": (
            "vosaline", "soce", "soce_abs", "soce_pra", "salt", "sosaline", "salnlvl", "saln", "sao", "o_sal", "o_salinity",
        ),
        "dic": ("tic", "dissiclvl", "o_dic", "sco212"),
        "alkalinity": ("totalk", "alkali", "alkalini", "talklvl", "o_alk", "alkalin"),
        "phosphate": ("trc_po4", "po4lvl", "phosph", "o_phos", "o_po4", "ipo4"),
        "silicate": ("sil", "sio3", "sio2", "sio4", "silvl", "o_si", "isilica"),
        "area": ("area_t", "tarea", "areat", "area_rho", "cell_area", "areacell", "area"),
        "volume": ("cell_volume", "volume_t", "vol_t"),
        "thickness": ("e3t", "dzt", "dht", "h_rho", "cell_thickness", "layer_thickness", "layerthickness", "thkcell"),
        "sea_floor_depth": ("bathymetry", "bathy", "bathy_metry", "ht", "sea_floor_depth", "bottom_depth", "bottomdepth"),
    },
))
