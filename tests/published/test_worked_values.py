"""Worked values of whole waters: the cross-check tables of the science sheet, confirmed there by a second reference."""

from __future__ import annotations

import pytest

import gridcarb

# T, S, alkalinity, DIC, phosphate, silicate, pressure -> values as printed (practice2022: total boron of Lee et al. 2010)
WATERS = [
    ((25, 35, 2300, 2000, 0, 0, 0), {
        "ph_total_scale": (8.0401, 5e-5), "co2_fugacity": (401.49, 0.011), "carbonate_ion": (210.89, 0.006),
        "calcite_saturation": (5.077, 6e-4), "aragonite_saturation": (3.346, 6e-4), "revelle_factor": (9.561, 6e-4),
    }),
    ((15, 35, 2300, 2100, 0, 0, 0), {
        "ph_total_scale": (8.0015, 5e-5), "co2_fugacity": (449.17, 0.006), "carbonate_ion": (144.54, 0.006),
        "calcite_saturation": (3.445, 6e-4), "aragonite_saturation": (2.213, 6e-4),
    }),
    ((0, 33.9, 2300, 2180, 1.8, 40, 0), {
        "ph_total_scale": (8.0472, 6e-5), "co2_fugacity": (384.80, 0.006), "carbonate_ion": (91.73, 0.006),
        "calcite_saturation": (2.211, 6e-4), "aragonite_saturation": (1.387, 7e-4),
    }),
    ((1.6, 34.68, 2430, 2345, 2.6, 160, 4000), {
        "ph_total_scale": (7.7310, 6e-5), "carbonate_ion": (69.48, 0.006), "calcite_saturation": (0.748, 6e-4),
        "aragonite_saturation": (0.494, 6e-4),
    }),
]  # fmt: skip


@pytest.mark.parametrize(("water", "printed"), WATERS)
def test_cross_check_table(water: tuple[float, ...], printed: dict[str, tuple[float, float]]) -> None:
    t, s, alkalinity, dic, phosphate, silicate, pressure = water
    found = gridcarb.speciate(
        temperature=t, salinity=s, alkalinity=alkalinity, dic=dic, phosphate=phosphate, silicate=silicate,
        pressure=pressure, constants="practice2022",
    )  # fmt: skip
    for key, (value, half_unit) in printed.items():
        assert float(found[key]) == pytest.approx(value, abs=half_unit), key


def test_scales_of_ph_lie_apart_as_published() -> None:
    """Free minus total +0.041 (0 degC) to +0.108 (25 degC); seawater minus total -0.010 to -0.013."""
    found = gridcarb.speciate(temperature=[0.0, 25.0], salinity=35, dic=2050, alkalinity=2300)
    free = found["ph_free_scale"] - found["ph_total_scale"]
    seawater = found["ph_seawater_scale"] - found["ph_total_scale"]
    assert free == pytest.approx([0.041, 0.108], abs=6e-4)
    assert ((seawater > -0.0135) & (seawater < -0.0095)).all()


def test_fugacity_coefficient_at_two_temperatures() -> None:
    """0.99560 at 0 degC and 0.99681 at 25 degC (Weiss 1974, re-derived), to one unit of the last digit."""
    found = gridcarb.speciate(temperature=[0.0, 25.0], salinity=35, dic=2050, alkalinity=2300)
    assert found["co2_fugacity"] / found["co2_partial_pressure"] == pytest.approx([0.99560, 0.99681], abs=1e-5)


def test_size_of_the_pressure_effect() -> None:
    """Leaving pressure out at 4000 m raises pH by 0.163 and aragonite saturation from 0.51 to 1.18."""
    deep = {"temperature": 1.6, "salinity": 34.7, "dic": 2310, "alkalinity": 2400, "phosphate": 2.2, "silicate": 120}
    with_pressure = gridcarb.speciate(**deep, pressure=4000)
    without = gridcarb.speciate(**deep)
    assert float(with_pressure["aragonite_saturation"]) == pytest.approx(0.509, abs=0.007)
    assert float(without["aragonite_saturation"]) == pytest.approx(1.18, abs=0.02)
    assert float(without["ph_total_scale"] - with_pressure["ph_total_scale"]) == pytest.approx(0.163, abs=0.002)


def test_revelle_factor_in_warm_and_polar_water() -> None:
    """Equilibrium at 420 ppm: Revelle factor 15.9 (0 degC), 11.6 (15), 9.1 (28), boron of either set."""
    found = gridcarb.speciate(
        temperature=[0.0, 15.0, 28.0], salinity=35, alkalinity=[2290, 2300, 2300], dic=[2180.1, 2084.5, 1975.5]
    )
    assert found["revelle_factor"] == pytest.approx([15.9, 11.6, 9.1], abs=0.15)
    assert found["aragonite_saturation"] == pytest.approx([1.31, 2.36, 3.66], abs=0.05)
