"""Short names of the CMIP tables; those that end in `os` are surface fields."""

from __future__ import annotations

from gridcarb.sources.conventions import Convention, declare

declare(Convention(
    key="cmip", title="CMIP", order=2, attribute="name",
    words={
        "temperature": ("thetao", "bigthetao", "tos", "thetaot"),
        "salinity": ("so", "sos"),
        "dic": ("dissic", "dissicos"),
        "alkalinity": ("talk", "talkos"),
        "phosphate": ("po4", "po4os"),
        "silicate": ("si", "sios"),
        "area": ("areacello",),
        "volume": ("volcello",),
        "thickness": ("thkcello",),
        "sea_fraction": ("sftof",),
        "basin": ("basin",),
        "sea_floor_depth": ("deptho",),
    },
))
