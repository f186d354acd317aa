"""`guide2007`: the Guide to best practices of 2007, with the boron of the ocean model intercomparisons."""

from __future__ import annotations

from gridcarb.chemistry.constants_set import ConstantsSet, declare_constants
from gridcarb.chemistry.formulas.boric import ln_kb_dickson1990
from gridcarb.chemistry.formulas.carbonic import ln_k1_lueker2000, ln_k2_lueker2000
from gridcarb.chemistry.formulas.fluoric import ln_kf_perez1987
from gridcarb.chemistry.formulas.gases import ln_fugacity_coefficient_weiss1974, ln_k0_weiss1974
from gridcarb.chemistry.formulas.phosphoric import ln_kp1_millero1995, ln_kp2_millero1995, ln_kp3_millero1995
from gridcarb.chemistry.formulas.silicic import ln_ksi_millero1995
from gridcarb.chemistry.formulas.solids import ln_k_aragonite_mucci1983, ln_k_calcite_mucci1983
from gridcarb.chemistry.formulas.sulfuric import ln_ks_dickson1990
from gridcarb.chemistry.formulas.totals import (
    boron_uppstrom1974,
    calcium_riley1967,
    fluoride_riley1965,
    sulfate_morris1966,
)
from gridcarb.chemistry.formulas.water import ln_kw_millero1995

GUIDE2007 = declare_constants(
    ConstantsSet(
        key="guide2007",
        title="Dickson, Sabine & Christian 2007, with total boron of Uppstrom 1974",
        k0=ln_k0_weiss1974,
        k1=ln_k1_lueker2000,
        k2=ln_k2_lueker2000,
        kb=ln_kb_dickson1990,
        kw=ln_kw_millero1995,
        kp1=ln_kp1_millero1995,
        kp2=ln_kp2_millero1995,
        kp3=ln_kp3_millero1995,
        ksi=ln_ksi_millero1995,
        ks=ln_ks_dickson1990,
        kf=ln_kf_perez1987,
        k_calcite=ln_k_calcite_mucci1983,
        k_aragonite=ln_k_aragonite_mucci1983,
        bt=boron_uppstrom1974,
        st=sulfate_morris1966,
        ft=fluoride_riley1965,
        ca=calcium_riley1967,
        ln_fugacity_coefficient=ln_fugacity_coefficient_weiss1974,
        temperature_range=(2.0, 35.0),
        salinity_range=(19.0, 43.0),
    )
)
