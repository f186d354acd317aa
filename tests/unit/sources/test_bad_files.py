"""Files that are not what they should be: each is refused with where, what, and how to mend it."""

from __future__ import annotations

from pathlib import Path

import pytest

from gridcarb.errors import InputError
from gridcarb.sources import handles, open_collection


def _refusal(gathered, folder: Path, **words) -> InputError:
    with pytest.raises(InputError) as caught:
        gathered(folder, **words)
    error = caught.value
    assert error.where
    assert error.what
    assert error.mend
    return error


def test_a_missing_file(gathered, tmp_path: Path) -> None:
    (tmp_path / "other.nc").write_bytes(b"")
    error = _refusal(gathered, tmp_path, files="lost.nc")
    assert "no such file" in error.what
    assert str(tmp_path / "lost.nc") in error.where
    assert "other.nc" in error.mend


def test_a_glob_without_a_match(gathered, tmp_path: Path) -> None:
    error = _refusal(gathered, tmp_path, files="nowhere/*.nc")
    assert "no file matches 'nowhere/*.nc'" in error.what


def test_no_files_at_all(gathered, tmp_path: Path) -> None:
    assert "names no input files" in _refusal(gathered, tmp_path).what


@pytest.mark.parametrize("content", [b"CDX", b"station,salinity\n1,35\n", b"\x89PNG\r\n\x1a\n" + bytes(600)])
def test_not_a_netcdf(gathered, tmp_path: Path, content: bytes) -> None:
    (tmp_path / "thing.nc").write_bytes(content)
    assert "neither a NetCDF file nor a Zarr store" in _refusal(gathered, tmp_path, files="thing.nc").what


def test_an_empty_file(gathered, tmp_path: Path) -> None:
    (tmp_path / "thing.nc").touch()
    assert _refusal(gathered, tmp_path, files="thing.nc").what == "the file is empty (0 bytes)"


def test_a_folder_that_is_no_store(gathered, tmp_path: Path) -> None:
    (tmp_path / "things").mkdir()
    error = _refusal(gathered, tmp_path, files="things")
    assert "not a Zarr store" in error.what
    assert "things/*.nc" in error.mend


@pytest.mark.parametrize(("form", "kept"), [("nc4", 0.5), ("nc4", 0.99), ("nc3", 0.5), ("nc3", 0.99), ("nc3", 0.02)])
def test_a_truncated_file(gathered, ocean, save, *, tmp_path: Path, form: str, kept: float) -> None:
    whole = save(ocean(), tmp_path / "whole.nc", form).read_bytes()
    (tmp_path / "cut.nc").write_bytes(whole[:int(len(whole) * kept)])
    error = _refusal(gathered, tmp_path, files="cut.nc")
    assert "cut short" in error.what
    assert "cut.nc" in error.where


def test_a_broken_store(gathered, ocean, save, tmp_path: Path) -> None:
    store = save(ocean(), tmp_path / "store", "zarr3")
    (store / "thetao" / "zarr.json").write_text('{"zarr_format": 3, "no')
    assert "damaged" in _refusal(gathered, tmp_path, files="store").what


def test_a_file_that_breaks_after_it_was_gathered(gathered, ocean, save, tmp_path: Path) -> None:
    store = save(ocean(), tmp_path / "store", "zarr3")
    ds = open_collection(gathered(tmp_path, files="store"))
    for chunk in (store / "so" / "c").rglob("*"):
        if chunk.is_file():
            chunk.write_bytes(chunk.read_bytes()[:7])
    assert ds.temperature.values.shape == (3, 3, 4, 5)
    with pytest.raises(InputError, match="store: so"):
        ds.salinity.load()


def test_a_file_that_vanished_after_it_was_gathered(gathered, ocean, save, tmp_path: Path) -> None:
    path = save(ocean(), tmp_path / "a.nc")
    ds = open_collection(gathered(tmp_path, files="a.nc"))
    path.unlink()
    with pytest.raises(InputError, match="no longer there"):
        ds.salinity.load()


@pytest.mark.parametrize("start", [0, 512, 4096])
def test_an_hdf5_file_with_a_user_block_is_recognised(gathered, ocean, save, tmp_path: Path, start: int) -> None:
    whole = save(ocean(), tmp_path / "whole.nc").read_bytes()
    (tmp_path / "a.nc").write_bytes(bytes(start) + whole)
    assert list(gathered(tmp_path, files="a.nc").roles) == ["temperature", "salinity", "dic", "alkalinity", "phosphate"]


def test_an_unreadable_file(gathered, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "a.nc").write_bytes(b"CDF\x01")

    def refuse(*_args: object, **_words: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    assert "Permission denied" in _refusal(gathered, tmp_path, files="a.nc").what


def test_a_file_that_fails_to_open_leaves_no_handle(gathered, tmp_path: Path) -> None:
    (tmp_path / "a.nc").write_bytes(b"\x89HDF\r\n\x1a\n" + bytes(100))
    with pytest.raises(InputError):
        handles.read(str(tmp_path / "a.nc"), "x", ())
    assert len(handles.NETCDF_HANDLES) == 0
