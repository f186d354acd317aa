"""The committed files: `first_look`, the input of the demonstration recipe.

One year of months on a global 3 degree grid with 22 levels, in the clothes of a climate model: potential temperature, a
salinity whose scale is left unsaid, carbon, alkalinity and nutrients in mol m-3 with the model's density in the global
attribute `rho0`; one variable a file, and the fixed fields beside them. Values are rounded to the steps of
`clothes.ROUNDING`.
"""

from __future__ import annotations

from pathlib import Path

import xarray as xr

from synthetic_grids import grids
from synthetic_grids.clothes import ROUNDING, Clothes, dress, filled, write

FOLDER = Path(__file__).parent / "first_look"
YEAR = 2010
ROWS, COLUMNS = 60, 120
LEVEL_EDGES = (0.0, 10.0, 20.0, 35.0, 50.0, 75.0, 100.0, 130.0, 170.0, 220.0, 300.0, 400.0, 550.0, 750.0, 1000.0, 1300.0,
               1700.0, 2200.0, 2800.0, 3500.0, 4200.0, 4900.0, 5600.0)
CLOTHES = Clothes(rounding=ROUNDING)

ATTRIBUTES: dict[str, object] = {
    "Conventions": "CF-1.11",
    "title": "An invented ocean in the clothes of a climate model",
    "institution": "none: this ocean does not exist",
    "source": "synthetic_grids: formulas of position, depth and time, sampled at cell centres and mid-month",
    "history": "written by python -m synthetic_grids",
    "references": "the documentation of the package synthetic_grids",
    "comment": "Tracers per volume are per volume of the model's sea water, whose density is rho0 everywhere.",
    "geography": "invented",
    "rho0": CLOTHES.density,
    "rho0_units": "kg m-3",
}


def first_look() -> dict[str, xr.Dataset]:
    """The datasets of the demonstration by file name, each exactly as it is written."""
    grid, depth, time = grids.rectilinear(ROWS, COLUMNS), grids.levels(LEVEL_EDGES), grids.months(YEAR, YEAR, "noleap")
    truth = grids.sample(grid["lon"], grid["lat"], depth["lev"], time["year"])
    dressed = dress(truth, depth["lev"], grid["lat"], CLOTHES)
    axes = grid.merge(depth).merge(time[["time", "time_bnds"]])
    files = {}
    for name in CLOTHES.names.values():
        variable = dressed[[name]]
        variable[name].attrs |= {"cell_methods": "area: mean time: mean", "cell_measures": "area: areacello"}
        placed = variable.assign_coords(axes.coords)
        files[f"{name}_model_{YEAR}.nc"] = _clothed_file(placed, external_variables="areacello")
    fixed = _fixed(grid)
    for name in ("areacello", "deptho"):
        files[f"{name}_model_fixed.nc"] = _clothed_file(fixed[[name]].assign_coords(grid.coords))
    return files


def _fixed(grid: xr.Dataset) -> xr.Dataset:
    """Area of the sea cells and depth of the sea floor (lat, lon)."""
    floor = grids.sea_floor(grid["lon"], grid["lat"]).transpose("lat", "lon")
    area = grids.cell_area(grid).transpose("lat", "lon").where(floor.notnull())
    of_area = {"standard_name": "cell_area", "long_name": "area of the sea cells", "units": "m2"}
    of_floor = {"standard_name": "sea_floor_depth_below_geoid", "long_name": "depth of the sea floor", "units": "m"}
    return xr.Dataset({"areacello": filled(area, of_area), "deptho": filled(floor.round(), of_floor)})


def _clothed_file(dataset: xr.Dataset, **attributes: str) -> xr.Dataset:
    """The dataset with bounds as plain variables and the attributes of the whole."""
    bounds = [str(name) for name in dataset.coords if str(name).endswith("_bnds")]
    return dataset.reset_coords(bounds).assign_attrs(ATTRIBUTES | attributes)


def make(folder: Path = FOLDER) -> list[Path]:
    """Write the files of the demonstration and give their paths."""
    folder.mkdir(parents=True, exist_ok=True)
    paths = []
    for name, dataset in first_look().items():
        write(dataset, folder / name, split=("time",))
        paths.append(folder / name)
    return paths
