"""Names that ocean models in wide use give their tracers when nobody renames them."""

from __future__ import annotations

from gridcarb.sources.conventions import Convention, declare

declare(Convention(
    key="models", title="model output", order=3, attribute="name",
    words={
        "temperature": ("votemper", "toce", "toce_con", "sosstsst"),
        "salinity": ("vosaline", "soce", "soce_abs", "salt", "sosaline"),
        "dic": ("tic",),
        "alkalinity": ("totalk", "alkali"),
        "phosphate": ("trc_po4",),
        "silicate": ("sil", "sio3", "sio2"),
    },
))
