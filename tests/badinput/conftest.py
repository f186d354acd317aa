"""A bench for bad input: a small invented ocean in a folder, a recipe beside it, and runs through the command line."""

from __future__ import annotations

import re
import shutil
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from hashlib import sha256
from pathlib import Path
from typing import Any

import pytest
import xarray as xr
from click.testing import CliRunner, Result
from ruamel.yaml import YAML

from gridcarb.cli.main import main
from gridcarb.sources.handles import close_all
from synthetic_grids import clothes, grids

Words = Mapping[str, Any]
RECIPE: Words = {
    "recipe": 1,
    "inputs": {"files": "*.nc"},
    "chemistry": {"fields": ["ph_total_scale"]},
    "output": {"folder": "result", "netcdf": False, "replace": True},
}
NAMES = clothes.MODEL_NAMES


@dataclass(frozen=True)
class Refusal:
    """The three lines of an error."""

    where: str
    what: str
    mend: str

    def line(self, place: int = 0, **fillings: str) -> Words:
        """A recipe line the mend names (in backquotes), its placeholders filled in."""
        lines = [text for text in re.findall(r"`([^`]+)`", self.mend) if ":" in text]
        text = lines[place]
        for placeholder, filling in fillings.items():
            assert placeholder in text
            text = text.replace(placeholder, filling)
        found: Words = YAML(typ="safe").load(text)
        assert isinstance(found, dict)
        return found


class Bench:
    """A folder of files and a recipe. `refusal` and `success` run the recipe and see what is left on the disk."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.words: Words = RECIPE

    @property
    def recipe(self) -> Path:
        return self.folder / "recipe.yaml"

    @property
    def result(self) -> Path:
        return self.folder / "result"

    def put(self, ocean: xr.Dataset, name: str = "ocean.nc") -> Path:
        """Write a dataset as it stands."""
        path = self.folder / name
        path.unlink(missing_ok=True)
        clothes.write(ocean.reset_coords([str(c) for c in ocean.coords if str(c).endswith("_bnds")]), path)
        return path

    def say(self, words: Words) -> None:
        """Write words into the recipe, over what is there."""
        self.words = _merged(self.words, words)

    def run(self, *options: str) -> Result:
        """`gridcarb run`; the recipe is what was said so far."""
        with self.recipe.open("w") as file:
            YAML(typ="safe").dump(self.words, file)
        return CliRunner().invoke(main, ["run", str(self.recipe), *options])

    def refusal(self, code: int, *options: str) -> Refusal:
        """Run twice: with nothing at the target, and over an earlier result. Nothing may be written, nothing be lost."""
        first = self._refused(code, *options)
        self.result.mkdir()
        (self.result / "journal.json").write_text('{"state": "complete"}')
        (self.result / "fields.nc").write_bytes(b"an earlier result")
        again = self._refused(code, *options)
        for place in sorted(self.result.iterdir()):
            place.unlink()
        self.result.rmdir()
        assert (first.where, first.what) == (again.where, again.what)
        return first

    def _refused(self, code: int, *options: str) -> Refusal:
        self.recipe.touch()
        before = _traces(self.folder, but=self.recipe)
        ended = self.run(*options)
        assert ended.exit_code == code, ended.output
        assert ended.stdout == ""
        assert "Traceback" not in ended.stderr
        assert _traces(self.folder, but=self.recipe) == before
        return _three_lines(ended.stderr)

    def success(self, *options: str) -> xr.Dataset:
        """Run, read the result, and clear it away."""
        ended = self.run("--quiet", *options)
        assert ended.exit_code == 0, ended.output
        assert sorted(place.name for place in self.folder.iterdir() if "result" in place.name) == ["result"]
        with xr.open_zarr(self.result / "fields.zarr", consolidated=False, chunks=None) as found:
            found.load()
        shutil.rmtree(self.result)
        return found


def _three_lines(text: str) -> Refusal:
    """Where, what and mend of the first error, or of the one fault of a recipe."""
    lines = re.split(r"\nand \d+ more:\n", text.strip())[0].split("\n")
    if lines[0] == "the recipe has one fault":
        lines = lines[1:]
    assert len(lines) == 3, text
    where, what, mend = (line.strip() for line in lines)
    assert mend.startswith("to mend it: ")
    return Refusal(where, what, mend.removeprefix("to mend it: "))


def _merged(old: Words, new: Words) -> Words:
    both = {key: _merged(old[key], new[key]) for key in old.keys() & new.keys() if isinstance(old[key], dict)}
    return {**old, **new, **both}


def _traces(folder: Path, but: Path) -> dict[str, str]:
    """Everything in the folder, with a digest of its content."""
    return {
        str(place): sha256(place.read_bytes()).hexdigest() if place.is_file() else "folder"
        for place in sorted(folder.rglob("*")) if place != but
    }


@pytest.fixture
def bench(tmp_path: Path) -> Bench:
    return Bench(tmp_path)


@pytest.fixture(autouse=True)
def _nothing_stays_open() -> Iterator[None]:
    yield
    close_all()


@pytest.fixture(scope="session")
def _truth() -> tuple[xr.Dataset, xr.Dataset, xr.Dataset, xr.Dataset]:
    grid, depth, time = grids.rectilinear(9, 12), grids.levels([0, 20, 200, 2000]), grids.months(2010, 2010, "noleap")
    return grid, depth, time, grids.sample(grid["lon"], grid["lat"], depth["lev"], time["year"])


@pytest.fixture
def ocean(_truth: tuple[xr.Dataset, ...]) -> Callable[..., xr.Dataset]:
    """Build a file: `ocean(surface=False, months=None, **how it is dressed)`; amounts in umol kg-1, CF standard names."""

    def build(*, surface: bool = False, months: slice | None = None, **dress: Any) -> xr.Dataset:
        grid, depth, time, truth = _truth
        look = clothes.Clothes(**{"tracer_units": "umol kg-1", "salinity": "practical", **dress})
        dressed = clothes.dress(truth, depth["lev"], grid["lat"], look).drop_vars("year", errors="ignore")
        file = dressed.assign_coords({**grid.coords, **depth.coords, **time[["time", "time_bnds"]].coords})
        file = file.isel(time=months) if months else file.isel(time=0, drop=True).drop_vars("time_bnds", errors="ignore")
        return file.isel(lev=0, drop=True).drop_vars("lev_bnds") if surface else file

    return build
