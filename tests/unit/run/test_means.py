"""Means over space of whole runs: copies of cells do not count, and blocks change the last digits at most."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from gridcarb.harmonise.sphere import RADIUS
from gridcarb.run.conduct import conduct
from gridcarb.run.plan import prepare
from synthetic_grids.areas import polygon_area
from synthetic_grids.kinds import scene_of, write_kind
from synthetic_grids.sphere import RADIUS_KM

KIND = "grid_tripolar_edge_fold"


@pytest.fixture(scope="module")
def folded(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """One file on a tripolar grid with fold row and halo columns."""
    return write_kind(KIND, tmp_path_factory.mktemp("folded"))[0]


def means(recipe, watcher, folder, file, **engine):
    outcome = conduct(prepare(recipe(
        files=file, engine={"workers": 1, **engine}, output={"folder": str(folder), "precision": "float64"},
        reading={"coverage": "global"},
        chemistry={"fields": ["ph_total_scale", "temperature"]},
    )), watcher)  # fmt: skip
    return outcome


def areas_of(mesh):
    """Areas by polygons, and by the exact formula for boxes where the rows follow parallels."""
    lon, lat = mesh.corners
    south, north = np.radians(lat.min(-1)), np.radians(lat.max(-1))
    boxes = np.radians(7.5) * (np.sin(north) - np.sin(south)) * RADIUS**2
    return np.where(lat.max(-1) <= 60.0, boxes, polygon_area(lon, lat) * (RADIUS / RADIUS_KM / 1e3) ** 2)


def test_means_are_those_of_the_sea_without_copies(recipe, watcher, tmp_path, folded):
    outcome = means(recipe, watcher, tmp_path / "whole", folded)
    scene = scene_of(KIND)
    sea = scene.truth["salinity"].isel(lev=0, time=0).notnull().values & ~scene.mesh.repeats
    area = areas_of(scene.mesh)
    surface = outcome.products["means"]["surface"]
    assert surface["sea"] == pytest.approx(area[sea].sum(), rel=1e-12)
    lengths = np.diff(scene.times.variables["time_bnds"].values, axis=1)[:, 0]
    warmth = (scene.truth["temperature"].isel(lev=0) * lengths[:, None, None]).sum("time").values / lengths.sum()
    expected = np.average(warmth[sea], weights=area[sea])
    assert surface["fields"]["temperature"]["mean"] == pytest.approx(expected, rel=1e-12)
    with_copies = scene.truth["salinity"].isel(lev=0, time=0).notnull().values
    assert abs(np.average(warmth[with_copies], weights=area[with_copies]) - expected) > 2e-2, "copies would show"
    assert surface["fields"]["ph_total_scale"]["coverage"] == pytest.approx(1.0, rel=1e-12)
    assert outcome.products["means"]["volume"]["sea"] > surface["sea"] * 1000
    shown = dict(next(part for part in outcome.summary().sections if part.title == "What was computed").rows)
    assert f"surface mean {surface['fields']['ph_total_scale']['mean']:.4f}" in shown["ph_total_scale"]


def test_blocks_change_the_last_digits_at_most(recipe, watcher, tmp_path, folded):
    whole = means(recipe, watcher, tmp_path / "whole", folded).products["means"]
    parts = means(recipe, watcher, tmp_path / "parts", folded, block={"time": 1, "cells": 100}).products["means"]
    for extent in ("surface", "volume"):
        assert parts[extent]["sea"] == pytest.approx(whole[extent]["sea"], rel=1e-13)
        for key in ("ph_total_scale", "temperature", "solution_status"):
            for word, value in whole[extent]["fields"][key].items():
                assert parts[extent]["fields"][key][word] == pytest.approx(value, rel=1e-12)
