"""What is made of a finished store: the NetCDF file and the figures."""

from __future__ import annotations

from pathlib import Path

import xarray as xr

from gridcarb.figures import FIGURES
from gridcarb.recipe import Recipe
from gridcarb.run.plan import FIGURE_FOLDER, FILE, STORE
from gridcarb.run.watching import Watcher
from gridcarb.write.netcdf import export


def make_file(folder: Path, watcher: Watcher) -> str:
    """The NetCDF file from the store in `folder`; its place inside."""
    watcher.message(f"exporting {FILE}")
    export(folder / STORE, folder / FILE)
    return FILE


def draw_figures(recipe: Recipe, folder: Path, watcher: Watcher) -> dict[str, str]:
    """The figures of a recipe from the store in `folder`; what -> place inside."""
    figures = folder / FIGURE_FOLDER
    figures.mkdir(exist_ok=True)
    written = {}
    with xr.open_zarr(folder / STORE, consolidated=False, chunks=None, decode_timedelta=False) as result:
        for number, settings in enumerate(recipe.figures, start=1):
            watcher.message(f"drawing figure {number} of {len(recipe.figures)}")
            place = FIGURES[settings.kind].draw(result, settings, figures)
            written[f"figure {number}"] = str(place.relative_to(folder))
    return written
