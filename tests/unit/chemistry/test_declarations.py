"""The conformance battery of the chemistry's shelves: it runs over every entry, so a new file is tested at once."""

from __future__ import annotations

import inspect
import math

import numba
import numpy as np
import pytest

from gridcarb.chemistry import COLUMNS, CONSTANTS, DERIVED, FORMULAS
from gridcarb.chemistry.compiled import arguments, tile_loop
from gridcarb.chemistry.declare import Formula
from gridcarb.chemistry.formulas.pressure import MILLERO1995
from gridcarb.chemistry.program import program
from gridcarb.chemistry.tile import speciate
from gridcarb.citations import CITATIONS
from gridcarb.compiling import plain
from gridcarb.fields import FIELDS, ROLES


def columns_at(t: float, s: float) -> dict[str, float]:
    """Columns an equation may name, at surface pressure."""
    found = {"t": t, "s": s}
    for name in ("tk", "sqrt_s", "ionic", "sqrt_ionic", "water_fraction"):
        found[name] = plain(COLUMNS[name])(*(found[argument] for argument in arguments(COLUMNS[name])))
    return {**found, "ln_tk": math.log(found["tk"]), "ln_water_fraction": math.log(found["water_fraction"])}


@pytest.mark.parametrize("formula", FORMULAS.values(), ids=list(FORMULAS))
def test_formula_gives_its_check_value(formula: Formula) -> None:
    columns = columns_at(formula.check.t, formula.check.s)
    value = formula.cell(*(columns[name] for name in formula.columns))
    assert abs(value - formula.check.value) <= formula.check.half_unit
    assert formula.check.source
    assert formula.citation in CITATIONS
    assert inspect.getdoc(plain(formula.cell))


@pytest.mark.parametrize("formula", FORMULAS.values(), ids=list(FORMULAS))
def test_compiled_formula_equals_its_plain_source(formula: Formula) -> None:
    for t, s in ((-1.5, 33.0), (25.0, 35.0), (40.0, 0.5)):
        columns = columns_at(t, s)
        given = [columns[name] for name in formula.columns]
        assert formula.cell(*given) == pytest.approx(plain(formula.cell)(*given), rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("key", list(CONSTANTS))
def test_set_is_complete_and_cited(key: str) -> None:
    chosen = CONSTANTS[key]
    assert chosen.key == key
    assert chosen.title
    for name, keys in chosen.citations().items():
        assert keys, name
        assert all(citation in CITATIONS for citation in keys)
    for name, scales in {"ks": {"free"}, "kf": {"total", "free"}, "k0": {""}, "k_calcite": {""}}.items():
        assert chosen.formulas()[name].scale in scales
    for name in ("k1", "k2", "kb", "kw", "kp1", "kp2", "kp3", "ksi"):
        assert chosen.formulas()[name].scale in {"total", "seawater"}
    assert set(chosen.volumes) == set(MILLERO1995)
    result = speciate(temperature=10, salinity=35, dic=2100, alkalinity=2300, constants=key)
    assert all(np.isfinite(value) for value in result.values())


@pytest.mark.parametrize("key", list(DERIVED))
def test_derived_field_is_declared_and_sane(key: str) -> None:
    field = FIELDS[key]
    assert field.part == "derived"
    assert field.citations
    value = float(speciate(temperature=15, salinity=35, dic=2080, alkalinity=2310, fields=[key])[key])
    assert field.sane_range[0] < value < field.sane_range[1]


def test_inputs_are_fields() -> None:
    assert all(FIELDS[role].part == "input" for role in ROLES)


def test_two_loops_of_one_name_are_refused() -> None:
    tile_loop("of_a_test", ("s",), "s + 1.0", {})
    with pytest.raises(RuntimeError, match="of_a_test"):
        tile_loop("of_a_test", ("s",), "s + 2.0", {})


def test_a_program_is_compiled_when_it_is_made() -> None:
    """Threads must find it ready: compiling is done under a lock, before they enter."""
    made, solve_cells = program("practice2022", ("bicarbonate_ion", "revelle_factor"))
    assert len(made.outputs) == 2
    assert numba.config.DISABLE_JIT or solve_cells.signatures
