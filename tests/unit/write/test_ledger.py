from __future__ import annotations

import json
import pickle
import threading
from dataclasses import replace

import numpy as np
import pytest
import xarray as xr
from hypothesis import given, settings
from hypothesis import strategies as st

import gridcarb.chemistry  # noqa: F401  puts the derived fields into the catalogue
from gridcarb.fields import FIELDS
from gridcarb.products import PRODUCTS
from gridcarb.write import ledger as ledgers
from gridcarb.write.ledger import DamagedMarkerError, Ledger, Marker

KEYS = ("ph_total_scale", "aragonite_saturation", "solution_status")


def marker(block: int = 0, **words) -> Marker:
    return Marker(
        block, "r" * 64, "i" * 64, {"time": (0, 2), "lat": (3, 7)}, 40, {"ph_total_scale": "crc32:00000001"},
        {"ph_total_scale": ("crc32:00000002", "")}, {"solved": 40}, {"land": 2}, {"read": 0.25}, **words,
    )


def tallied(seed: int) -> dict:
    """A share of every product there is, over an invented block with areas and thicknesses."""
    rng = np.random.default_rng(seed)
    block = xr.Dataset({
        "ph_total_scale": (("lev", "x"), rng.normal(8, 0.2, (3, 50))),
        "aragonite_saturation": (("lev", "x"), rng.lognormal(0, 1, (3, 50))),
        "solution_status": (("lev", "x"), rng.integers(0, 3, (3, 50)).astype("i1")),
    }).assign_coords(
        cell_area=("x", rng.uniform(1e9, 1e10, 50)), sea=(("lev", "x"), np.ones((3, 50), bool)),
        top_level=("x", np.zeros(50, int)), time_share=1 / 3, cell_thickness=("lev", [10.0, 50.0, 300.0]),
    )
    tallies = {key: product.start([FIELDS[name] for name in KEYS]) for key, product in PRODUCTS.items()}
    for tally in tallies.values():
        tally.add(block)
    return tallies


def test_a_marker_comes_back_as_it_was(tmp_path):
    ledger = Ledger(tmp_path)
    assert ledger.get(1234) is None
    ledger.put(marker(1234))
    assert ledger.get(1234) == marker(1234)
    assert ledger.place(1234) == tmp_path / "0001" / "0001234.json"
    assert marker().slices() == {"time": slice(0, 2), "lat": slice(3, 7)}


def test_tallies_of_every_product_merge_as_exactly_as_if_they_had_never_been_away(tmp_path):
    ledger = Ledger(tmp_path)
    straight, back = tallied(0), tallied(0)
    for seed in range(1, 6):
        ledger.put(marker(seed, tallies=tallied(seed)))
        for key in PRODUCTS:
            straight[key].merge(tallied(seed)[key])
    for seed in (3, 1, 5, 2, 4):  # in any order
        for key, share in ledger.get(seed).tallies.items():
            back[key].merge(share)
    for key in PRODUCTS:
        assert back[key].report() == straight[key].report(), key
    assert straight["ranges"].report()["ph_total_scale"]["values"] == 900


@settings(max_examples=60, deadline=None)
@given(at=st.integers(0, 10**6), flip=st.integers(1, 255))
def test_a_marker_with_any_byte_changed_is_found_out(tmp_path_factory, at, flip):
    ledger = Ledger(tmp_path_factory.mktemp("ledger"))
    ledger.put(marker(7, tallies=tallied(7)))
    content = bytearray(ledger.place(7).read_bytes())
    content[at % len(content)] ^= flip
    ledger.place(7).write_bytes(content)
    try:
        found = ledger.get(7)
    except DamagedMarkerError:
        return
    # A changed blank is no change.
    assert replace(found, tallies={}) == marker(7)
    assert {key: tally.report() for key, tally in found.tallies.items()} == {
        key: tally.report() for key, tally in tallied(7).items()
    }


@pytest.mark.parametrize("content", [b"", b"{", b"[1]", b"\xff\xfe", b'{"block": 3}'])
def test_a_marker_that_is_none_is_damaged(tmp_path, content):
    ledger = Ledger(tmp_path)
    ledger.put(marker(3))
    ledger.place(3).write_bytes(content)
    with pytest.raises(DamagedMarkerError):
        ledger.get(3)


def test_the_marker_of_another_block_is_not_taken_for_this_one(tmp_path):
    ledger = Ledger(tmp_path)
    ledger.put(marker(3))
    ledger.place(3).rename(ledger.place(4))
    with pytest.raises(DamagedMarkerError, match="marker of block 4"):
        ledger.get(4)


class Evil:
    def __reduce__(self):
        return print, ("this must never be printed",)


def test_nothing_is_run_that_a_marker_brings_along(tmp_path, capsys):
    ledger = Ledger(tmp_path)
    ledger.put(marker(3, tallies={"ranges": Evil()}))
    with pytest.raises(DamagedMarkerError, match="UnpicklingError"):
        ledger.get(3)
    assert capsys.readouterr().out == ""
    assert pickle.loads(pickle.dumps(Evil())) is None  # it would have been
    assert "never" in capsys.readouterr().out


def test_blocks_are_counted_and_listed_in_order(tmp_path):
    ledger = Ledger(tmp_path / "ledger")
    assert (ledger.count(), list(ledger.blocks()), ledger.last()) == (0, [], None)
    ledger.open({"a": 1})
    for block in (999_999, 5, 2000, 0):
        ledger.put(marker(block))
    ledger.put_failure(12, {"what": "it broke"})
    assert ledger.count() == 4
    assert [block for block, _ in ledger.blocks()] == [0, 5, 2000, 999_999]
    ledger.drop(5)
    ledger.drop(5)
    assert [block for block, _ in ledger.blocks()] == [0, 2000, 999_999]
    assert ledger.last() >= max(written for _, written in ledger.blocks()) - 1


def test_a_note_of_failure_goes_when_the_block_is_done(tmp_path):
    ledger = Ledger(tmp_path)
    ledger.put_failure(12, {"what": "it broke", "where": "b"})
    ledger.put_failure(3, {"what": "so did this"})
    assert ledger.failures() == {3: {"what": "so did this"}, 12: {"what": "it broke", "where": "b"}}
    ledger.put(marker(12))
    assert list(ledger.failures()) == [3]


def test_the_charter_keeps_its_order_and_is_none_when_damaged(tmp_path):
    ledger = Ledger(tmp_path / "ledger")
    assert ledger.charter() is None
    ledger.open({"z": {"time": 1, "lat": 2}, "a": [1]})
    assert json.dumps(ledger.charter()) == '{"z": {"time": 1, "lat": 2}, "a": [1]}'
    content = bytearray((tmp_path / "ledger" / "charter.json").read_bytes())
    for at in range(len(content)):
        changed = content.copy()
        changed[at] ^= 2
        (tmp_path / "ledger" / "charter.json").write_bytes(changed)
        assert ledger.charter() in (None, {"z": {"time": 1, "lat": 2}, "a": [1]})


def test_a_writer_that_dies_leaves_the_old_marker_and_a_rest_that_is_swept(tmp_path, monkeypatch):
    ledger = Ledger(tmp_path)
    ledger.put(marker(1))
    before = ledger.place(1).read_bytes()

    def die(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr(ledgers.Path, "replace", die)
    with pytest.raises(KeyboardInterrupt):
        ledger.put(replace(marker(1), cells=41))
    monkeypatch.undo()
    assert ledger.place(1).read_bytes() == before
    assert ledger.count() == 1
    ledger.sweep()
    assert [path.name for path in (tmp_path / "0000").iterdir()] == ["0000001.json"]


def test_many_threads_mark_the_same_blocks(tmp_path):
    ledger = Ledger(tmp_path)
    threads = [threading.Thread(target=lambda: [ledger.put(marker(block)) for block in range(40)]) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert [ledger.get(block) for block in range(40)] == [marker(block) for block in range(40)]
    assert not list(tmp_path.rglob(".*"))
