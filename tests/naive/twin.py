"""The slow twin: one cell of sea water by bisection, in as many digits as asked.

Written apart from the package, from the papers' equations and the conventions of the project; it imports nothing of
gridcarb. `m` is a number module: `math` for double precision, or an mpmath context for any other. Amounts come in
umol/kg, temperature in degC, pressure in dbar.
"""

from __future__ import annotations

import math
from typing import Any

BORON = {"guide2007": ("0.000232", "10.811"), "practice2022": ("0.0002414", "10.811")}

# a0, a1, a2 (cm3/mol), b0, b1 (cm3/mol/bar): Millero 1995, sea water, boric t^2 term negative, silicic like boric
VOLUMES = {
    "K1": ("-25.5", "0.1271", "0", "-3.08e-3", "0.0877e-3"),
    "K2": ("-15.82", "-0.0219", "0", "1.13e-3", "-0.1475e-3"),
    "KB": ("-29.48", "0.1622", "-2.608e-3", "-2.84e-3", "0"),
    "KW": ("-20.02", "0.1119", "-1.409e-3", "-5.13e-3", "0.0794e-3"),
    "KS": ("-18.03", "0.0466", "0.316e-3", "-4.53e-3", "0.09e-3"),
    "KF": ("-9.78", "-0.0090", "-0.942e-3", "-3.91e-3", "0.054e-3"),
    "KP1": ("-14.51", "0.1211", "-0.321e-3", "-2.67e-3", "0.0427e-3"),
    "KP2": ("-23.12", "0.1758", "-2.647e-3", "-5.15e-3", "0.09e-3"),
    "KP3": ("-26.57", "0.2020", "-3.042e-3", "-4.08e-3", "0.0714e-3"),
    "KSi": ("-29.48", "0.1622", "-2.608e-3", "-2.84e-3", "0"),
    "calcite": ("-48.76", "0.5304", "0", "-11.76e-3", "0.3692e-3"),
    "aragonite": ("-45.96", "0.5304", "0", "-11.76e-3", "0.3692e-3"),
}


class Twin:
    """Constants and totals of one water, then its carbonate system."""

    def __init__(self, t: Any, s: Any, p: Any, constants: str = "guide2007", m: Any = math) -> None:
        self.m = m
        self.n = float if m is math else m.mpf
        self.t, self.s, self.bar = self.n(t), self.n(s), self.n(p) / 10
        self.tk = self.t + self.n("273.15")
        self._totals(constants)
        self._surface()
        self._at_pressure()

    def _totals(self, constants: str) -> None:
        n = self.n
        chlorinity = self.s / n("1.80655")
        ratio, mass = BORON[constants]
        self.BT = n(ratio) / n(mass) * chlorinity
        self.ST = n("0.14") / n("96.062") * chlorinity
        self.FT = n("0.000067") / n("18.998") * chlorinity
        self.Ca = n("0.02128") / n("40.087") * chlorinity

    def _surface(self) -> None:
        n, m, T, S = self.n, self.m, self.tk, self.s
        L, q = m.log(T), m.sqrt(S)
        ionic = n("19.924") * S / (1000 - n("1.005") * S)
        water = m.log(1 - n("0.001005") * S)
        ten = n(10)
        K = {}
        K["K0"] = m.exp(
            n("-60.2409") + n("93.4517") * 100 / T + n("23.3585") * m.log(T / 100)
            + S * (n("0.023517") - n("0.023656") * (T / 100) + n("0.0047036") * (T / 100) ** 2)
        )
        K["K1"] = ten ** -(
            n("3633.86") / T - n("61.2172") + n("9.67770") * L - n("0.011555") * S + n("0.0001152") * S**2
        )
        K["K2"] = ten ** -(
            n("471.78") / T + n("25.9290") - n("3.16967") * L - n("0.01781") * S + n("0.0001122") * S**2
        )
        K["KB"] = m.exp(
            (n("-8966.90") - n("2890.53") * q - n("77.942") * S + n("1.728") * q**3 - n("0.0996") * S**2) / T
            + n("148.0248") + n("137.1942") * q + n("1.62142") * S
            - (n("24.4344") + n("25.085") * q + n("0.2474") * S) * L + n("0.053105") * q * T
        )
        K["KW"] = m.exp(
            n("148.9652") - n("13847.26") / T - n("23.6521") * L
            + (n("118.67") / T - n("5.977") + n("1.0495") * L) * q - n("0.01615") * S
        )
        K["KP1"] = m.exp(
            n("-4576.752") / T + n("115.525") - n("18.453") * L + (n("-106.736") / T + n("0.69171")) * q
            + (n("-0.65643") / T - n("0.01844")) * S
        )
        K["KP2"] = m.exp(
            n("-8814.715") / T + n("172.0883") - n("27.927") * L + (n("-160.340") / T + n("1.3566")) * q
            + (n("0.37335") / T - n("0.05778")) * S
        )
        K["KP3"] = m.exp(
            n("-3070.75") / T - n("18.141") + (n("17.27039") / T + n("2.81197")) * q
            + (n("-44.99486") / T - n("0.09984")) * S
        )
        K["KSi"] = m.exp(
            n("-8904.2") / T + n("117.385") - n("19.334") * L + (n("-458.79") / T + n("3.5913")) * m.sqrt(ionic)
            + (n("188.74") / T - n("1.5998")) * ionic + (n("-12.1652") / T + n("0.07871")) * ionic**2 + water
        )
        K["KS"] = m.exp(
            n("-4276.1") / T + n("141.328") - n("23.093") * L
            + (n("-13856") / T + n("324.57") - n("47.986") * L) * m.sqrt(ionic)
            + (n("35474") / T - n("771.54") + n("114.723") * L) * ionic
            - n("2698") / T * ionic * m.sqrt(ionic) + n("1776") / T * ionic**2 + water
        )
        kf_total = m.exp(n("874") / T - n("9.68") + n("0.111") * q)
        K["KF"] = kf_total / (1 + self.ST / K["KS"])  # to the free scale
        K["calcite"] = ten ** (
            n("-171.9065") - n("0.077993") * T + n("2839.319") / T + n("71.595") * m.log(T) / m.log(ten)
            + (n("-0.77712") + n("0.0028426") * T + n("178.34") / T) * q - n("0.07711") * S + n("0.0041249") * q**3
        )
        K["aragonite"] = ten ** (
            n("-171.945") - n("0.077993") * T + n("2903.293") / T + n("71.595") * m.log(T) / m.log(ten)
            + (n("-0.068393") + n("0.0017276") * T + n("88.135") / T) * q - n("0.10018") * S + n("0.0059415") * q**3
        )
        self.surface = K

    def _factor(self, name: str) -> Any:
        a0, a1, a2, b0, b1 = (self.n(value) for value in VOLUMES[name])
        volume = a0 + a1 * self.t + a2 * self.t**2
        compressibility = b0 + b1 * self.t
        gas = self.n("8.31446261815324") * 10  # cm3 bar / (mol K)
        return self.m.exp((-volume + compressibility / 2 * self.bar) * self.bar / (gas * self.tk))

    def _at_pressure(self) -> None:
        K0 = self.surface
        K = {"K0": K0["K0"]}
        K["KS"] = K0["KS"] * self._factor("KS")
        K["KF"] = K0["KF"] * self._factor("KF")  # free scale
        total_0 = 1 + self.ST / K0["KS"]
        seawater_0 = total_0 + self.FT / K0["KF"]
        self.total = 1 + self.ST / K["KS"]
        self.seawater = self.total + self.FT / K["KF"]
        for name in ("K1", "K2", "KB", "KW", "KP1", "KP2", "KP3", "KSi"):
            on_seawater = K0[name] * seawater_0 / total_0 * self._factor(name)
            K[name] = on_seawater * self.total / self.seawater
        for name in ("calcite", "aragonite"):
            K[name] = K0[name] * self._factor(name)
        self.K = K

    def alkalinity(self, h: Any, dic: Any, phosphate: Any, silicate: Any) -> Any:
        """Total alkalinity (mol/kg) of a water of hydrogen ion h (total scale)."""
        K = self.K
        free = h / self.total
        carbon = h * h + K["K1"] * h + K["K1"] * K["K2"]
        p = h**3 + K["KP1"] * h * h + K["KP1"] * K["KP2"] * h + K["KP1"] * K["KP2"] * K["KP3"]
        h3po4 = phosphate * h**3 / p
        hpo4 = phosphate * K["KP1"] * K["KP2"] * h / p
        po4 = phosphate * K["KP1"] * K["KP2"] * K["KP3"] / p
        return (
            dic * K["K1"] * h / carbon
            + 2 * dic * K["K1"] * K["K2"] / carbon
            + self.BT * K["KB"] / (K["KB"] + h)
            + K["KW"] / h
            + hpo4 + 2 * po4 - h3po4
            + silicate * K["KSi"] / (K["KSi"] + h)
            - free
            - self.ST * free / (K["KS"] + free)
            - self.FT * free / (K["KF"] + free)
        )

    def root(self, dic: Any, alkalinity: Any, phosphate: Any, silicate: Any, digits: int = 16) -> Any:
        """Hydrogen ion (mol/kg, total scale) by bisection in its logarithm; amounts in mol/kg."""
        low, high = self.n(-60), self.n(10)
        for _ in range(int(digits * 3.33) + 10):
            middle = (low + high) / 2
            if self.alkalinity(self.m.exp(middle), dic, phosphate, silicate) > alkalinity:
                low = middle
            else:
                high = middle
        return self.m.exp((low + high) / 2)

    def solve(self, dic: Any, alkalinity: Any, phosphate: Any = 0, silicate: Any = 0, digits: int = 16) -> dict[str, Any]:
        """Every field of the catalogue; amounts in umol/kg."""
        n, m, K = self.n, self.m, self.K
        micro = n(10) ** -6
        x, a, p, si = (n(value) * micro for value in (dic, alkalinity, phosphate, silicate))
        h = self.root(x, a, p, si, digits)
        carbon = h * h + K["K1"] * h + K["K1"] * K["K2"]
        co2, hco3, co3 = x * h * h / carbon, x * K["K1"] * h / carbon, x * K["K1"] * K["K2"] / carbon
        T = self.tk
        B = n("-1636.75") + n("12.0408") * T - n("0.0327957") * T**2 + n("3.16528e-5") * T**3
        coefficient = m.exp((B + 2 * (n("57.7") - n("0.118") * T)) / (n("82.05746") * T))
        log10 = m.log10
        return {
            "ph_total_scale": -log10(h),
            "ph_free_scale": -log10(h / self.total),
            "ph_seawater_scale": -log10(h / self.total * self.seawater),
            "hydrogen_ion": h,
            "aqueous_co2": co2 / micro,
            "bicarbonate_ion": hco3 / micro,
            "carbonate_ion": co3 / micro,
            "co2_fugacity": co2 / K["K0"] / micro,
            "co2_partial_pressure": co2 / K["K0"] / micro / coefficient,
            "calcite_saturation": self.Ca * co3 / K["calcite"],
            "aragonite_saturation": self.Ca * co3 / K["aragonite"],
            "revelle_factor": self._revelle(h, x, p, si),
        }

    def _revelle(self, h: Any, dic: Any, phosphate: Any, silicate: Any) -> Any:
        """dln CO2 / dln DIC at constant alkalinity, from central differences of alkalinity and CO2 in h and DIC."""
        m, K = self.m, self.K
        d = self.n(10) ** (-6 if m is math else -(m.dps // 3))

        def log_co2(ln_h: Any, ln_dic: Any) -> Any:
            v = m.exp(ln_h)
            return ln_dic + 2 * ln_h - m.log(v * v + K["K1"] * v + K["K1"] * K["K2"])

        def alkalinity(ln_h: Any, ln_dic: Any) -> Any:
            return self.alkalinity(m.exp(ln_h), m.exp(ln_dic), phosphate, silicate)

        u, w = m.log(h), m.log(dic)
        a_h = (alkalinity(u + d, w) - alkalinity(u - d, w)) / (2 * d)
        a_x = (alkalinity(u, w + d) - alkalinity(u, w - d)) / (2 * d)
        c_h = (log_co2(u + d, w) - log_co2(u - d, w)) / (2 * d)
        c_x = (log_co2(u, w + d) - log_co2(u, w - d)) / (2 * d)
        return c_x - c_h * a_x / a_h
