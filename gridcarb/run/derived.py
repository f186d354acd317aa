"""What is made of a finished store: NetCDF files and figures."""

from __future__ import annotations

from pathlib import Path

import xarray as xr

from gridcarb.figures import FIGURES
from gridcarb.recipe import Recipe
from gridcarb.run.plan import FIGURE_FOLDER, FILE, FILES, STORE
from gridcarb.run.watching import Watcher
from gridcarb.write.netcdf import export, export_parts


def make_files(recipe: Recipe, folder: Path, watcher: Watcher) -> dict[str, str]:
    """The NetCDF file or files of a recipe from the store in `folder`; what -> place inside."""
    if recipe.output.netcdf_files == "one":
        watcher.message(f"exporting {FILE}")
        export(folder / STORE, folder / FILE)
        return {"NetCDF file": FILE}
    watcher.message(f"exporting NetCDF files {recipe.output.netcdf_files}")
    export_parts(folder / STORE, folder / FILES, recipe.output.netcdf_files)
    return {"NetCDF files": FILES}


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
