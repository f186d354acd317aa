"""The Zarr store of a result: all metadata made once, then filled block by block, in any order and from any thread.

Opening it asks nothing special of xarray: metadata are consolidated as a courtesy to readers, and never relied on here.
"""

from __future__ import annotations

import warnings
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any, Literal, NamedTuple

import numpy as np
import xarray as xr
import zarr
from zarr.core.chunk_key_encodings import ChunkKeyEncodingParams
from zarr.errors import ZarrUserWarning

from gridcarb.axes import Axes
from gridcarb.errors import BlockError, OutputError
from gridcarb.fields import Field
from gridcarb.write.attributes import field_attributes, inherited_attributes
from gridcarb.write.chunks import DIMS_V2, chunked_field
from gridcarb.write.coordinates import clean_coordinates, numbers
from gridcarb.write.disk import room_for
from gridcarb.write.encoding import (
    Precision,
    checksum,
    chunks_of,
    compressor,
    dims_of,
    dtype_of,
    fill_of,
    pieces,
    split_chunks,
    stored,
)  # fmt: skip

_KEYS: dict[Literal[2, 3], ChunkKeyEncodingParams] = {
    2: {"name": "v2", "separator": "."}, 3: {"name": "default", "separator": "."},
}
"""How chunk files are called: ``c.0.3.1``, all of a field in one folder. With a slash each would lie in a folder alone."""


def create(
    path: Path, *, template: xr.Dataset, fields: Sequence[Field], axes: Axes, chunks: Mapping[str, int],
    attributes: Mapping[str, object], zarr_format: Literal[2, 3] = 3, precision: Precision = "float32",
) -> None:
    """Make the whole store at `path`, which must not exist: coordinates with their numbers, fields still empty.

    Parameters
    ----------
    template : the grid: raw coords (bounds among them; lazy ones are copied in pieces) and sizes. Attributes of its data
        variables that hold for every field (cell_methods, cell_measures, grid_mapping, mesh) are carried over.
    fields : what will be written, each under its key.
    axes : the axes of `template`.
    chunks : chunk length by dimension; a dimension not named is one chunk.
    attributes : the global attributes.
    """
    coordinates = clean_coordinates(template, axes)
    for field in fields:
        if field.key in coordinates:
            raise OutputError(
                f"the grid has a coordinate called '{field.key}', the name of a field to be written", where=str(path),
                mend=f"rename the coordinate in the input files, or leave '{field.key}' out of `fields` in the recipe",
            )
    inherited = inherited_attributes(template)
    status = next((field.key for field in fields if field.part == "status"), None)
    with room_for(path, sum(variable.nbytes for variable in coordinates.values())):
        group = zarr.open_group(path, mode="w-", zarr_format=zarr_format, attributes=_plain(attributes))
        for name, variable in coordinates.items():
            _put_coordinate(group, name, variable)
        for field in fields:
            dims = dims_of(field, axes)
            shape = {dim: template.sizes[dim] for dim in dims}
            attrs = field_attributes(field, dims, coordinates, inherited, status)
            dtype = dtype_of(field, precision)
            _make(group, field.key, shape=shape, dtype=dtype, chunks=chunks_of(shape, chunks), attributes=attrs,
                  fill=fill_of(dtype, zarr_format, missing=dtype.kind == "f"))
        _consolidate(path)


class Written(NamedTuple):
    """What proves that a region of a field is as it was written.

    values : checksum of its numbers, as stored.
    chunks : checksum of each chunk file, in the order of the chunks; "" for a chunk of nothing but fill, which has no file.
    """

    values: str
    chunks: tuple[str, ...]


def write_block(path: Path, region: Mapping[str, slice], block: xr.Dataset) -> dict[str, Written]:
    """Write the data variables of `block` into their place and give back the checksums of each.

    region : dimension -> slice of the whole grid; a dimension not named is taken whole. The region must consist of
        whole chunks, since two writers in one chunk lose data silently: anything else is a `BlockError`, before a byte
        is written. Writing the same block twice leaves the same bytes.
    """
    work = []
    for key in block.data_vars:
        field, variable = chunked_field(path, str(key)), block.variables[key]
        if set(field.dims) != set(variable.dims):
            raise BlockError(f"'{key}' has dimensions {tuple(variable.dims)}, the store has {field.dims}", where=str(path))
        selection = field.selection(region)
        values = stored(variable.transpose(*field.dims).values, field.dtype)
        expected = tuple(part.stop - part.start for part in selection)
        if values.shape != expected:
            raise BlockError(f"a block of shape {values.shape} does not fit a region of {expected}", where=f"{path}: {key}")
        work.append((field, selection, values))
    with room_for(path, sum(values.nbytes for *_, values in work)):
        return {field.name: Written(checksum(values), field.write(selection, values)) for field, selection, values in work}


def _put_coordinate(group: zarr.Group, name: str, variable: xr.Variable) -> None:
    shape = {str(dim): size for dim, size in variable.sizes.items()}
    dtype = np.dtype("i1") if variable.dtype.kind == "b" else variable.dtype.newbyteorder("=")
    chunks = split_chunks(variable.shape, dtype.itemsize)
    array = _make(group, name, shape=shape, dtype=dtype, chunks=chunks, attributes=variable.attrs,
                  fill=_own_fill(variable, dtype, group.metadata.zarr_format))
    for piece in pieces(variable.shape, chunks):
        array[piece] = numbers(variable[piece])


def _own_fill(variable: xr.Variable, dtype: np.dtype[Any], zarr_format: Literal[2, 3]) -> object:
    """Readers of format 2 know the fill of an integer from the array, not from its attributes."""
    if "_FillValue" in variable.attrs and dtype.kind in "iu":
        return int(np.ravel(variable.attrs["_FillValue"])[0])
    return fill_of(dtype, zarr_format, missing=False)


def _make(
    group: zarr.Group, name: str, *, shape: Mapping[str, int], dtype: np.dtype[Any], chunks: tuple[int, ...],
    attributes: Mapping[str, object], fill: object,
) -> zarr.Array[Any]:
    dims = list(shape)
    third = group.metadata.zarr_format == 3
    return group.create_array(
        name, shape=tuple(shape.values()), dtype=str if dtype.kind == "O" else dtype, chunks=chunks,
        fill_value=fill, chunk_key_encoding=_KEYS[group.metadata.zarr_format],
        compressors=compressor(group.metadata.zarr_format), dimension_names=dims if third else None,
        attributes=_plain(attributes if third else {**attributes, DIMS_V2: dims}),
    )


def _consolidate(path: Path) -> None:
    with warnings.catch_warnings():
        # Format 3 does not specify consolidated metadata yet; xarray looks for them and complains where there are none.
        warnings.simplefilter("ignore", ZarrUserWarning)
        zarr.consolidate_metadata(str(path))


def _plain(attributes: Mapping[str, object]) -> dict[str, Any]:
    """Attributes as JSON has them: NumPy numbers and arrays become plain ones."""
    return {
        key: value.tolist() if isinstance(value, (np.generic, np.ndarray)) else value for key, value in attributes.items()
    }
