"""The length a classic file must have, against files the NetCDF library writes."""

from __future__ import annotations

from pathlib import Path

import netCDF4
import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from gridcarb.sources.classic import expected_length

FORMATS = ("NETCDF3_CLASSIC", "NETCDF3_64BIT_OFFSET", "NETCDF3_64BIT_DATA")
variable = st.tuples(st.sampled_from(["i1", "i2", "i4", "f4", "f8", "S1"]), st.booleans(), st.integers(0, 2))


@given(
    variables=st.lists(variable, min_size=1, max_size=4), records=st.integers(1, 3), width=st.integers(1, 7),
    form=st.sampled_from(FORMATS), note=st.text("ab", max_size=9),
)
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_the_length_is_that_of_the_file(
    tmp_path: Path, *, variables: list[tuple[str, bool, int]], records: int, width: int, form: str, note: str
) -> None:
    path = tmp_path / "some.nc"
    with netCDF4.Dataset(path, "w", format=form) as ds:
        ds.createDimension("record", None)
        for name in "xy":
            ds.createDimension(name, width)
        ds.note = note
        for place, (dtype, recording, rank) in enumerate(variables):
            dims = (*(("record",) if recording else ()), *"xy"[:rank])
            made = ds.createVariable(f"v{place}", dtype, dims)
            made.units = "m" * (place + 1)
            shape = [records if dim == "record" else width for dim in dims]
            made[...] = np.full(shape, b"a" if dtype == "S1" else 1, dtype)
    expected = expected_length(path)
    assert expected is not None
    # Only the padding of the last variable may follow.
    assert expected <= path.stat().st_size < expected + 4


def test_a_header_cut_short(tmp_path: Path) -> None:
    path = tmp_path / "some.nc"
    with netCDF4.Dataset(path, "w", format="NETCDF3_CLASSIC") as ds:
        ds.createDimension("x", 3)
        ds.createVariable("v", "f8", ("x",))
    path.write_bytes(path.read_bytes()[:40])
    with pytest.raises(EOFError):
        expected_length(path)


def test_a_file_still_being_written_leaves_it_open(tmp_path: Path) -> None:
    path = tmp_path / "some.nc"
    with netCDF4.Dataset(path, "w", format="NETCDF3_CLASSIC") as ds:
        ds.createDimension("t", None)
    raw = bytearray(path.read_bytes())
    raw[4:8] = b"\xff" * 4
    path.write_bytes(raw)
    assert expected_length(path) is None
