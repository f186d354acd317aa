"""Memory on paper, and that what is measured stays below it."""

from __future__ import annotations

import gc
import tracemalloc
from pathlib import Path

import pytest
import xarray as xr
from hypothesis import given
from hypothesis import strategies as st

from gridcarb.errors import BudgetError
from gridcarb.run.budget import (
    DEFAULT_KEPT_BYTES,
    DEFAULT_TASK_BYTES,
    Footprint,
    allowed_per_task,
    kept_per_process,
    refuse_over_budget,
)  # fmt: skip
from gridcarb.run.plan import prepare
from gridcarb.run.task import run_block
from gridcarb.sources import open_collection
from gridcarb.write.store import create

FOOTPRINT = Footprint(raw_bytes=24, fields=3, item_bytes=4)


@given(st.builds(Footprint, st.integers(4, 96), st.integers(1, 40), st.sampled_from((4, 8)), st.booleans()),
       st.integers(0, 10**10))
def test_the_most_cells_that_fit_are_the_most(footprint: Footprint, allowed: int) -> None:
    cells = footprint.cells_within(allowed)
    assert footprint.projected(cells + 1) > allowed
    assert footprint.projected(cells) <= allowed or cells == 0


def test_memory_is_shared_by_the_workers() -> None:
    assert allowed_per_task(2_000_000_000, 4) == 500_000_000
    assert allowed_per_task(2_000_000_000, 4, kept=400_000_000) == 400_000_000
    assert allowed_per_task(None, 4, kept=10**8) == DEFAULT_TASK_BYTES


def test_what_blocks_share_is_kept_twice_once_or_not_at_all() -> None:
    assert kept_per_process(0, 10**9, 1, 0) == 0
    found = [kept_per_process(10**8, memory, 1, 10**8) for memory in (5 * 10**8, 3 * 10**8, 2 * 10**8, 10**8)]
    assert found == [2 * 10**8, 15 * 10**7, 10**8, 0]
    assert kept_per_process(10**8, 8 * 10**8, 4, 10**8) == 10**8
    assert kept_per_process(10**8, 3 * 10**8, 1, 25 * 10**7) == 0
    assert kept_per_process(DEFAULT_KEPT_BYTES, None, 1, 10**8) == DEFAULT_KEPT_BYTES
    assert kept_per_process(DEFAULT_KEPT_BYTES, None, 2, 10**8) == DEFAULT_KEPT_BYTES
    assert kept_per_process(DEFAULT_KEPT_BYTES + 1, None, 1, 10**8) == 0


def test_where_the_smallest_block_does_not_fit_smaller_chunks_are_advised() -> None:
    with pytest.raises(BudgetError) as caught:
        refuse_over_budget(FOOTPRINT, 5_000_000, column=50, unit=5_000_000, memory=10**9, workers=4, kept=10**8)
    columns = int(caught.value.mend.split("cells: ")[1].split("}")[0])
    assert "`output: {chunks: {time: 1, cells: " in caught.value.mend
    assert "block" not in caught.value.mend
    refuse_over_budget(FOOTPRINT, 50 * columns, column=50, unit=50, memory=10**9, workers=4, kept=10**8)


def test_what_fits_is_not_refused() -> None:
    refuse_over_budget(FOOTPRINT, FOOTPRINT.cells_within(10**8), column=50, unit=50, memory=4 * 10**8, workers=4)


def test_a_refusal_names_sizes_that_fit() -> None:
    with pytest.raises(BudgetError) as caught:
        refuse_over_budget(FOOTPRINT, 5_000_000, column=50, unit=50, memory=10**9, workers=4)
    needed = FOOTPRINT.projected(5_000_000)
    assert f"{needed / 1e6:,.1f} MB" in caught.value.what
    memory = float(caught.value.mend.split("`memory: ")[1].split(" GB")[0])
    refuse_over_budget(FOOTPRINT, 5_000_000, column=50, unit=50, memory=round(memory * 1e9), workers=4)
    workers = int(caught.value.mend.split("`workers: ")[1].split("`")[0])
    refuse_over_budget(FOOTPRINT, 5_000_000, column=50, unit=50, memory=10**9, workers=workers)
    columns = int(caught.value.mend.split("of at most ")[1].split(" ")[0].replace(",", ""))
    refuse_over_budget(FOOTPRINT, 50 * columns, column=50, unit=50, memory=10**9, workers=4)


def test_no_block_is_advised_where_not_even_one_column_fits() -> None:
    with pytest.raises(BudgetError) as caught:
        refuse_over_budget(FOOTPRINT, 50, column=50, unit=50, memory=1000, workers=2)
    assert "block" not in caught.value.mend
    assert "workers:" not in caught.value.mend
    assert "`memory: 0.1 GB`" in caught.value.mend


def test_the_plan_refuses_a_run_that_would_not_fit(recipe) -> None:
    with pytest.raises(BudgetError, match=r"of 2 workers has 0\.1 MB"):
        prepare(recipe(engine={"memory": "200 kB"}))


def _terrain_following(ds: xr.Dataset) -> xr.Dataset:
    """Depths that differ from column to column, so that pressure is a field of its own."""
    stretch = xr.ones_like(ds["thetao"].isel(time=0, lev=0), dtype="f8") + ds["lat"] / 200
    depth = (ds["lev"] * stretch).transpose("lev", "lat", "lon").astype("f4")
    ds = ds.drop_vars(["lev", "lev_bnds"])
    for name in ds.data_vars:
        ds[name].attrs["coordinates"] = "depth"
    ds["depth"] = (depth.dims, depth.values, {"standard_name": "depth", "units": "m", "positive": "down"})
    return ds


@pytest.mark.parametrize(("shape", "words"), [
    ("flat", {"chemistry": {"fields": ["ph_total_scale"]}}),
    ("flat", {"chemistry": {"fields": "all"}, "reading": {"density": "in situ"},
              "output": {"precision": "float64", "amounts": "per volume"}}),
    ("tall", {"chemistry": {"fields": "all"}}),
    ("terrain", {"chemistry": {"fields": ["revelle_factor"]}, "reading": {"density": "in situ"}}),
])
def test_a_task_takes_no_more_than_projected(shape, words, ocean, save_ocean, recipe, tmp_path: Path) -> None:
    if shape == "tall":
        ds = ocean(8, 10, 4, tuple(float(20 * level) for level in range(101)))
    else:
        ds = ocean(40, 60, 2, tuple(float(100 * level) for level in range(11)))
    if shape == "terrain":
        ds = _terrain_following(ds)
    words = {**words, "engine": {"workers": 1, "memory": "1 GB"}}
    plan = prepare(recipe(save_ocean(ds, tmp_path / "ocean.nc"), **words))
    job = plan.job(tmp_path)
    create(job.store, template=open_collection(plan.collection), fields=plan.fields, axes=plan.collection.axes,
           chunks=plan.layout.chunks, attributes={}, precision=plan.recipe.output.precision)
    run_block(job, 0)  # compiled, imported and opened: the second time shows what a block takes
    gc.collect()
    tracemalloc.start()
    run_block(job, 0)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert plan.layout.cells_per_block * 50 < peak <= plan.footprint.projected(plan.layout.cells_per_block)
