"""The unit words accepted, and their conversion.

UDUNITS (through cf-units) reads the grammar of a unit; this module adds the spellings of the trade that it does not know
(mole equivalents, psu, molar, "per kg of sea water"), refuses what it would read as something else (C is a coulomb to
it), sorts units by what they measure, and keeps every factor an exact fraction until the last step. UDUNITS' own
arithmetic is floating point and not exact (umol L-1 to umol m-3 gives 999.9999999999998).
"""

from __future__ import annotations

import functools
import re
from collections.abc import Collection
from dataclasses import dataclass
from fractions import Fraction
from typing import Any, Literal

from gridcarb.errors import UnitsError

Kind = Literal[
    "amount per mass", "amount per volume", "mass per volume", "mass fraction", "practical salinity", "temperature",
    "length", "area", "pressure", "number",
]

ACCEPTED: dict[Kind, tuple[str, ...]] = {
    "amount per mass": ("umol kg-1", "mol kg-1", "mmol kg-1", "umol/kg", "ueq kg-1", "1e-6 mol kg-1"),
    "amount per volume": ("mol m-3", "mmol m-3", "umol L-1", "mmol/m^3", "meq m-3", "uM"),
    "mass per volume": ("kg m-3", "g L-1", "g/cm3"),
    "mass fraction": ("g kg-1", "kg kg-1"),
    "practical salinity": ("1", "0.001", "1e-3", "psu", "PSS-78"),
    "temperature": ("degC", "degree_Celsius", "celsius", "K", "kelvin"),
    "length": ("m", "cm", "km"),
    "area": ("m2", "km2", "cm^2"),
    "pressure": ("dbar", "bar", "Pa"),
    "number": (),
}
"""Spellings named in error messages, by what they measure; a first choice, not the whole list."""

_PRACTICAL = frozenset({
    "1", "1.0", "0.001", ".001", "1e-3", "1e-03", "1.e-3", "10^-3", "psu", "psu-78", "pss", "pss78", "pss-78", "practical",
    "practical salinity", "practical salinity unit", "practical salinity units", "practical_salinity_units", "ppt",
    "per mil", "permil", "per mille", "o/oo", "‰", "parts per thousand",
})
"""Lower-case spellings under which salinities on the practical scale are written: the number itself is meant."""

_CELSIUS = frozenset({
    "degc", "deg_c", "deg c", "deg. c", "c", "°c", "ºc", "oc", "celsius", "degree_celsius", "degrees_celsius",
    "degree celsius", "degrees celsius", "degree_c", "degrees_c", "degree c", "degrees c", "degs c", "degreec", "degreesc",
})
_KELVIN = frozenset({"k", "kelvin", "kelvins", "degk", "deg_k", "deg k", "degree_k", "degrees_k", "degree k", "degrees k"})
"""Lower-case spellings of the two temperature scales; anything else (fahrenheit, 2 K) is refused."""

_DIGITS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻−–·µμ", "0123456789---.uu")
_PREFIX = r"(?:milli|micro|nano|m|u|n|k)?"
_SUBSTANCE = (r"(CaCO3|CO2|DIC|carbon|C|PO4|phosphorus|phosphate|P|SiO2|SiO4|SiO3|silicon|silicate|Si|"
              r"[Ee]q(?:uiv(?:alents?)?)?)\)?(?![A-Za-z])")
_REWRITES: tuple[tuple[re.Pattern[str], str], ...] = (
    (re.compile(r"(?i)[-_ ]*\(?(?:of[ _])?(?:sw|sea[-_ ]?water)\)?(?![A-Za-z])"), ""),  # kg-sw, kg of seawater
    (re.compile(r"_per_| per "), "/"),
    (re.compile(r"\*\*"), "^"),
    (re.compile(r"\^[{(]([-+]?\d+)[})]"), r"^\1"),  # m^{-3}, m^(-3)
    (re.compile(r"(?<![A-Za-z])([mun]?)M(?![A-Za-z0-9^-])"), r"\1mol L-1"),  # uM, mM: moles per litre
    (re.compile(r"([mu])Mol"), r"\1mol"),
)
_NAMED: tuple[tuple[re.Pattern[str], str], ...] = (
    (re.compile(rf"(?<![A-Za-z])({_PREFIX}(?:mol(?:es?)?|g(?:rams?)?))[-_ ]?\(?{_SUBSTANCE}"), r"\1"),  # mmol C m-3, gC
    (re.compile(rf"(?<![A-Za-z])({_PREFIX})([Ee]q)(?:uiv(?:alents?)?)?(?![A-Za-z])"), r"\1mol"),  # meq m-3
    (re.compile(rf"((?:mol|g).*?)[-_ ]+\(?(?:(?:as|of)[-_ ])?{_SUBSTANCE}$"), r"\1"),  # mg/L as CaCO3
)
"""Ways to name the substance counted or weighed; UDUNITS would take C for coulomb and P for poise."""

_DEFINITION = re.compile(r"(?P<number>[-+]?[\d.]+(?:e[-+]?\d+)?)?(?: ?(?P<base>[^@ ]+))?")
_KINDS: dict[frozenset[str], Kind] = {
    frozenset({"mol", "kg-1"}): "amount per mass",
    frozenset({"mol", "m-3"}): "amount per volume",
    frozenset({"kg", "m-3"}): "mass per volume",
    frozenset({"m"}): "length",
    frozenset({"m2"}): "area",
    frozenset({"m-1", "kg", "s-2"}): "pressure",
    frozenset(): "number",
}


@dataclass(frozen=True)
class Linear:
    """`converted = number * scale + offset`, in float64."""

    scale: float
    offset: float = 0.0

    def __call__(self, numbers: Any) -> Any:
        """Convert a number, an array or a DataArray; what it is, it stays."""
        scaled = numbers if self.scale == 1.0 else numbers * self.scale
        return scaled if self.offset == 0.0 else scaled + self.offset


@dataclass(frozen=True)
class Unit:
    """A unit that was read: what it measures, its exact size and origin in SI, and the substance it names, if any.

    A number v in this unit is (v + origin) * size in SI base units (mol kg-1, mol m-3, kg m-3, kg kg-1, K, m, Pa);
    numbers on the practical salinity scale are taken as they are.
    """

    kind: Kind
    size: Fraction
    origin: Fraction = Fraction(0)
    substance: str | None = None


def read(text: object, *, where: str = "", mend: str = "", expected: Collection[Kind] = ()) -> Unit:
    """Read a unit; raise `UnitsError` for a text that is missing, unreadable, or not of the `expected` kinds."""
    wanted = tuple(expected)
    if not isinstance(text, str) or not text.strip():
        raise UnitsError("the units are missing", where=where, mend=_advice(mend, wanted))
    try:
        unit = _read(text.strip())
    except ValueError:
        raise UnitsError(f"the units '{text}' cannot be read", where=where, mend=_advice(mend, wanted)) from None
    if wanted and unit.kind not in wanted:
        raise UnitsError(
            f"the units '{text}' measure {unit.kind}; needed is {' or '.join(wanted)}", where=where,
            mend=_advice(mend, wanted),
        )
    return unit


def conversion(
    text: object, target: str, *, where: str = "", mend: str = "", molar_mass: float | None = None,
    substances: Collection[str] = (),
) -> Linear:
    """The conversion of numbers in the units `text` into the units `target`.

    Parameters
    ----------
    text, target : units; both must measure the same thing.
    where, mend : what an error shall say of the place and the cure.
    molar_mass : g mol-1; with it, mass per volume (or per mass) becomes amount per volume (or per mass).
    substances : the substances `text` may name, as in "mmol C m-3"; "eq" stands for mole equivalents.

    Raises
    ------
    UnitsError : units that are missing, unreadable, of another kind, of a mass without molar mass, or of another substance.
    """
    goal = read(target)
    unit = read(text, where=where, mend=mend)
    size = unit.size
    if goal.kind.startswith("amount") and unit.kind.startswith("mass"):
        if molar_mass is None:
            raise UnitsError(
                f"the units '{text}' are a mass of some substance, and its molar mass is not known for certain",
                where=where,
                mend=_advice(mend, (goal.kind,), "or state the amount that 1 of these units stands for, such as "
                             "'0.083257 mol m-3' for g m-3 of carbon or '0.0199827 meq L-1' for mg/L of CaCO3"),
            )
        size = size * 1000 / Fraction(str(molar_mass))
        unit = Unit("amount per volume" if unit.kind == "mass per volume" else "amount per mass", size)
    if unit.kind != goal.kind:
        read(text, where=where, mend=mend, expected=(goal.kind,))
    if unit.substance and unit.substance not in substances:
        raise UnitsError(f"the units '{text}' count {unit.substance}, which this variable is not", where=where, mend=mend)
    scale = size / goal.size
    return Linear(float(scale), float(unit.origin * scale - goal.origin))


def _advice(mend: str, kinds: Collection[Kind], more: str = "") -> str:
    words = ", ".join(f"'{word}'" for kind in kinds for word in ACCEPTED[kind])
    return "; ".join(part for part in (mend, words and f"accepted are for instance {words}", more) if part)


@functools.lru_cache(maxsize=256)
def _read(text: str) -> Unit:
    """Read a stripped text; ValueError if it is not a unit or not of a kind known here."""
    folded = text.lower()
    if folded in _PRACTICAL:
        return Unit("practical salinity", Fraction(1))
    if folded in _CELSIUS:
        return Unit("temperature", Fraction(1), Fraction("273.15"))
    if folded in _KELVIN:
        return Unit("temperature", Fraction(1))
    plain, substance = _plain(text)
    size, base = _define(plain)
    kind = _KINDS.get(base)
    if kind is None or size <= 0:
        raise ValueError(text)
    if kind == "number" and re.search(r"(?<![A-Za-z])[kmu]?g(?:rams?)?(?![A-Za-z])", plain):
        kind = "mass fraction"  # UDUNITS cancels kg/kg
    return Unit(kind, size, Fraction(0), substance)


def _plain(text: str) -> tuple[str, str | None]:
    """The text in letters UDUNITS reads, and the substance it named ("eq" for mole equivalents)."""
    text = text.translate(_DIGITS)
    if text.isupper() and "MOL" in text:
        text = text.lower()  # UMOL/KG, as the tables of bottle data have it
    for pattern, plain in _REWRITES:
        text = pattern.sub(plain, text)
    for pattern, plain in _NAMED:
        named = pattern.search(text)
        if named:
            substance = "eq" if named.group(2).lower().startswith("eq") else named.group(2)
            return pattern.sub(plain, text).strip(), substance
    return text, None


def _define(plain: str) -> tuple[Fraction, frozenset[str]]:
    """Size and SI base units as UDUNITS defines them; its decimal digits are taken as exact."""
    from cf_units import Unit as Udunit

    unit = Udunit(plain)
    if unit.is_unknown() or unit.is_no_unit() or unit.is_time_reference():
        raise ValueError(plain)
    match = _DEFINITION.fullmatch(unit.definition)
    if match is None:
        raise ValueError(plain)
    parts = frozenset(part for part in (match["base"] or "").split(".") if part not in ("", "1"))
    return Fraction(match["number"] or "1"), parts
