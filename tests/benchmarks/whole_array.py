"""What a practitioner scripts by hand: the same chemistry as whole-array NumPy, Newton until all cells converge.

The yardstick of the benchmark; written apart from the package, for arrays of one shape, outputs as asked below.
"""

from __future__ import annotations

import numpy as np

VOLUMES = {
    "K1": (-25.5, 0.1271, 0.0, -3.08e-3, 0.0877e-3), "K2": (-15.82, -0.0219, 0.0, 1.13e-3, -0.1475e-3),
    "KB": (-29.48, 0.1622, -2.608e-3, -2.84e-3, 0.0), "KW": (-20.02, 0.1119, -1.409e-3, -5.13e-3, 0.0794e-3),
    "KS": (-18.03, 0.0466, 0.316e-3, -4.53e-3, 0.09e-3), "KF": (-9.78, -0.0090, -0.942e-3, -3.91e-3, 0.054e-3),
    "KP1": (-14.51, 0.1211, -0.321e-3, -2.67e-3, 0.0427e-3), "KP2": (-23.12, 0.1758, -2.647e-3, -5.15e-3, 0.09e-3),
    "KP3": (-26.57, 0.2020, -3.042e-3, -4.08e-3, 0.0714e-3), "KSi": (-29.48, 0.1622, -2.608e-3, -2.84e-3, 0.0),
    "calcite": (-48.76, 0.5304, 0.0, -11.76e-3, 0.3692e-3), "aragonite": (-45.96, 0.5304, 0.0, -11.76e-3, 0.3692e-3),
}  # fmt: skip

Array = np.ndarray


def pressure_factor(name: str, t: Array, bar: Array) -> Array:
    a0, a1, a2, b0, b1 = VOLUMES[name]
    volume = a0 + a1 * t + a2 * t**2
    compressibility = b0 + b1 * t
    return np.exp((-volume + 0.5 * compressibility * bar) * bar / (83.1446261815324 * (t + 273.15)))


def surface_constants(t: Array, s: Array, st: Array) -> dict[str, Array]:
    T = t + 273.15
    L, q = np.log(T), np.sqrt(s)
    ionic = 19.924 * s / (1000 - 1.005 * s)
    root, water = np.sqrt(ionic), np.log(1 - 0.001005 * s)
    K = {
        "K0": np.exp(
            -60.2409 + 93.4517 * 100 / T + 23.3585 * np.log(T / 100)
            + s * (0.023517 - 0.023656 * (T / 100) + 0.0047036 * (T / 100) ** 2)
        ),
        "K1": 10.0 ** -(3633.86 / T - 61.2172 + 9.67770 * L - 0.011555 * s + 0.0001152 * s**2),
        "K2": 10.0 ** -(471.78 / T + 25.9290 - 3.16967 * L - 0.01781 * s + 0.0001122 * s**2),
        "KB": np.exp(
            (-8966.90 - 2890.53 * q - 77.942 * s + 1.728 * s**1.5 - 0.0996 * s**2) / T + 148.0248 + 137.1942 * q
            + 1.62142 * s - (24.4344 + 25.085 * q + 0.2474 * s) * L + 0.053105 * q * T
        ),
        "KW": np.exp(148.9652 - 13847.26 / T - 23.6521 * L + (118.67 / T - 5.977 + 1.0495 * L) * q - 0.01615 * s),
        "KP1": np.exp(-4576.752 / T + 115.525 - 18.453 * L + (-106.736 / T + 0.69171) * q + (-0.65643 / T - 0.01844) * s),
        "KP2": np.exp(-8814.715 / T + 172.0883 - 27.927 * L + (-160.340 / T + 1.3566) * q + (0.37335 / T - 0.05778) * s),
        "KP3": np.exp(-3070.75 / T - 18.141 + (17.27039 / T + 2.81197) * q + (-44.99486 / T - 0.09984) * s),
        "KSi": np.exp(
            -8904.2 / T + 117.385 - 19.334 * L + (-458.79 / T + 3.5913) * root + (188.74 / T - 1.5998) * ionic
            + (-12.1652 / T + 0.07871) * ionic**2 + water
        ),
        "KS": np.exp(
            -4276.1 / T + 141.328 - 23.093 * L + (-13856 / T + 324.57 - 47.986 * L) * root
            + (35474 / T - 771.54 + 114.723 * L) * ionic - 2698 / T * ionic**1.5 + 1776 / T * ionic**2 + water
        ),
        "calcite": 10.0 ** (
            -171.9065 - 0.077993 * T + 2839.319 / T + 71.595 * np.log10(T)
            + (-0.77712 + 0.0028426 * T + 178.34 / T) * q - 0.07711 * s + 0.0041249 * s**1.5
        ),
        "aragonite": 10.0 ** (
            -171.945 - 0.077993 * T + 2903.293 / T + 71.595 * np.log10(T)
            + (-0.068393 + 0.0017276 * T + 88.135 / T) * q - 0.10018 * s + 0.0059415 * s**1.5
        ),
    }
    K["KF"] = np.exp(874 / T - 9.68 + 0.111 * q) / (1 + st / K["KS"])
    return K


def constants_at_pressure(t: Array, s: Array, bar: Array, st: Array, ft: Array) -> dict[str, Array]:
    surface = surface_constants(t, s, st)
    K = {"K0": surface["K0"]}
    for name in ("KS", "KF", "calcite", "aragonite"):
        K[name] = surface[name] * pressure_factor(name, t, bar)
    to_seawater = (1 + st / surface["KS"] + ft / surface["KF"]) / (1 + st / surface["KS"])
    back = (1 + st / K["KS"]) / (1 + st / K["KS"] + ft / K["KF"])
    for name in ("K1", "K2", "KB", "KW", "KP1", "KP2", "KP3", "KSi"):
        K[name] = surface[name] * to_seawater * pressure_factor(name, t, bar) * back
    return K


def solve(K: dict[str, Array], total: dict[str, Array], dic: Array, alk: Array, pt: Array, sit: Array) -> Array:
    """Newton in pH for the whole array until the largest step is below 1e-10."""
    ph = np.full(dic.shape, 8.0)
    free = 1 + total["st"] / K["KS"]
    for _ in range(50):
        h = 10.0**-ph
        D = h * h + K["K1"] * h + K["K1"] * K["K2"]
        p = h**3 + K["KP1"] * h**2 + K["KP1"] * K["KP2"] * h + K["KP1"] * K["KP2"] * K["KP3"]
        borate = total["bt"] * K["KB"] / (K["KB"] + h)
        silicate = sit * K["KSi"] / (K["KSi"] + h)
        alkalinity = (
            dic * K["K1"] * (h + 2 * K["K2"]) / D + borate + K["KW"] / h - h / free + silicate
            + pt * (K["KP1"] * K["KP2"] * h + 2 * K["KP1"] * K["KP2"] * K["KP3"] - h**3) / p
            - total["st"] / (1 + K["KS"] * free / h) - total["ft"] / (1 + K["KF"] * free / h)
        )
        slope = np.log(10) * (
            dic * K["K1"] * h * (h * h + K["K1"] * K["K2"] + 4 * h * K["K2"]) / D**2
            + borate * h / (K["KB"] + h) + K["KW"] / h + h / free
        )
        step = (alk - alkalinity) / slope
        ph = ph + step
        if np.abs(step).max() < 1e-10:
            break
    return ph


def speciate(
    temperature: Array, salinity: Array, pressure: Array, dic: Array, alkalinity: Array, phosphate: Array, silicate: Array
) -> dict[str, Array]:
    chlorinity = salinity / 1.80655
    total = {
        "bt": 0.000232 / 10.811 * chlorinity, "st": 0.14 / 96.062 * chlorinity, "ft": 0.000067 / 18.998 * chlorinity,
        "ca": 0.02128 / 40.087 * chlorinity,
    }  # fmt: skip
    K = constants_at_pressure(temperature, salinity, pressure / 10, total["st"], total["ft"])
    x = dic * 1e-6
    ph = solve(K, total, x, alkalinity * 1e-6, phosphate * 1e-6, silicate * 1e-6)
    h = 10.0**-ph
    D = h * h + K["K1"] * h + K["K1"] * K["K2"]
    co2, hco3, co3 = x * h * h / D, x * K["K1"] * h / D, x * K["K1"] * K["K2"] / D
    return {
        "ph_total_scale": ph, "aqueous_co2": co2 * 1e6, "bicarbonate_ion": hco3 * 1e6, "carbonate_ion": co3 * 1e6,
        "co2_fugacity": co2 / K["K0"] * 1e6, "calcite_saturation": total["ca"] * co3 / K["calcite"],
        "aragonite_saturation": total["ca"] * co3 / K["aragonite"],
    }  # fmt: skip
