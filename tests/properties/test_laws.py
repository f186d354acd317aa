"""Laws of the carbonate system, as property tests on the public array face."""

from __future__ import annotations

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

import gridcarb
from tests.naive.twin import Twin

PER_MICRO = 1e6


def waters() -> st.SearchStrategy[dict[str, float]]:
    return st.fixed_dictionaries({
        "temperature": st.floats(-1.8, 40), "salinity": st.floats(0, 45), "pressure": st.floats(0, 10000),
        "dic": st.floats(1, 8000), "alkalinity": st.floats(-2000, 9000), "phosphate": st.floats(0, 50),
        "silicate": st.floats(0, 300),
    })  # fmt: skip


quick = settings(deadline=None, max_examples=60)


@quick
@given(waters())
def test_mass_balance(water: dict[str, float]) -> None:
    found = gridcarb.speciate(**water)
    total = found["aqueous_co2"] + found["bicarbonate_ion"] + found["carbonate_ion"]
    np.testing.assert_allclose(total, water["dic"], rtol=1e-13)


@quick
@given(waters())
def test_charge_balance(water: dict[str, float]) -> None:
    """Alkalinity put together from the fields and the twin's minor acids is the alkalinity given."""
    found = {key: float(value) for key, value in gridcarb.speciate(**water).items()}
    twin = Twin(water["temperature"], water["salinity"], water["pressure"])
    carbonate = (found["bicarbonate_ion"] + 2 * found["carbonate_ion"]) / PER_MICRO
    h = found["hydrogen_ion"]
    other = twin.alkalinity(h, 0.0, water["phosphate"] / PER_MICRO, water["silicate"] / PER_MICRO)
    size = abs(water["alkalinity"]) + 2 * water["dic"] + PER_MICRO * (h + twin.K["KW"] / h + twin.BT)
    assert abs((carbonate + other) * PER_MICRO - water["alkalinity"]) <= 1e-11 * size


@quick
@given(waters(), st.floats(1e-6, 0.5))
def test_ph_falls_as_dic_rises(water: dict[str, float], share: float) -> None:
    more = water | {"dic": water["dic"] * (1 + share)}
    before, after = (gridcarb.speciate(**each, fields=["ph_total_scale", "aqueous_co2"]) for each in (water, more))
    assert after["ph_total_scale"] <= before["ph_total_scale"] + 1e-13
    assert after["aqueous_co2"] > before["aqueous_co2"]


@quick
@given(waters(), st.floats(0.01, 2000))
def test_ph_rises_with_alkalinity(water: dict[str, float], added: float) -> None:
    more = water | {"alkalinity": water["alkalinity"] + added}
    before, after = (gridcarb.speciate(**each)["ph_total_scale"] for each in (water, more))
    assert after > before


@quick
@given(waters())
def test_solve_and_invert_is_the_identity(water: dict[str, float]) -> None:
    """From pH and DIC back to alkalinity (twin), and from there to pH again."""
    first = gridcarb.speciate(**water, fields=["hydrogen_ion", "ph_total_scale"])
    twin = Twin(water["temperature"], water["salinity"], water["pressure"])
    amounts = [water[name] / PER_MICRO for name in ("dic", "phosphate", "silicate")]
    alkalinity = twin.alkalinity(float(first["hydrogen_ion"]), *amounts) * PER_MICRO
    again = gridcarb.speciate(**(water | {"alkalinity": alkalinity}), fields=["ph_total_scale"])
    np.testing.assert_allclose(again["ph_total_scale"], first["ph_total_scale"], rtol=0, atol=2e-11)


@quick
@given(waters())
def test_revelle_factor_is_the_slope_of_ln_co2_against_ln_dic(water: dict[str, float]) -> None:
    assume(water["dic"] > 50)
    step = 1e-5
    up, down = (
        float(gridcarb.speciate(**(water | {"dic": water["dic"] * np.exp(sign * step)}))["aqueous_co2"]) for sign in (1, -1)
    )
    slope = (np.log(up) - np.log(down)) / (2 * step)
    np.testing.assert_allclose(gridcarb.speciate(**water)["revelle_factor"], slope, rtol=2e-6)


@quick
@given(waters(), st.floats(0.5, 2.0))
def test_ratio_of_the_two_saturations_depends_on_water_alone(water: dict[str, float], factor: float) -> None:
    """Calcite over aragonite saturation is a ratio of solubilities: it depends on temperature, salinity and pressure."""
    assume(water["salinity"] > 1)
    found = gridcarb.speciate(**water)
    other = gridcarb.speciate(**(water | {"dic": water["dic"] * factor}))
    np.testing.assert_allclose(
        found["calcite_saturation"] / found["aragonite_saturation"],
        other["calcite_saturation"] / other["aragonite_saturation"], rtol=1e-12,
    )  # fmt: skip
