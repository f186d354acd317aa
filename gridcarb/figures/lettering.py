"""Words and units as a reader of a figure expects them."""

from __future__ import annotations

import re

_POWERS = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_WORD = re.compile(r"^([A-Za-zµ%]+)\^?(-?\d+)?$")
_NAMES = {
    "umol": "µmol", "uatm": "µatm", "ueq": "µeq", "um": "µm", "degrees": "°", "degC": "°C", "degree_C": "°C",
    "degree_Celsius": "°C",
}


def readable_units(units: str) -> str:
    """UDUNITS text in print: ``umol kg-1`` becomes ``µmol kg⁻¹``; the unit 1 becomes empty.

    Words it does not know stay as they are.
    """
    if units.strip() in ("", "1"):
        return ""
    printed = []
    for word in units.split():
        match = _WORD.match(word)
        name, power = match.groups() if match else (word, None)
        printed.append(_NAMES.get(name, name) + (power or "").translate(_POWERS))
    return " ".join(printed)


def with_units(name: str, units: str) -> str:
    """ "name (units)", or the name alone for the unit 1."""
    printed = readable_units(units)
    return f"{name} ({printed})" if printed else name


def sentence(text: str) -> str:
    """The text with a capital, unless its first word mixes cases on purpose ("pH")."""
    rest = text.split(" ", maxsplit=1)[0][1:]
    return text[:1].upper() + text[1:] if rest == rest.lower() else text


def meridian(longitude: float) -> str:
    """A longitude in print, any turn: ``30°W``, ``0°``, ``180°``."""
    east = (longitude + 180) % 360 - 180
    if abs(east) in (0, 180):
        return f"{abs(east):g}°"
    return f"{abs(east):g}°{'E' if east > 0 else 'W'}"


def parallel(latitude: float) -> str:
    """A latitude in print: ``60°S``, ``0°``."""
    return f"{abs(latitude):g}°" + ("" if latitude == 0 else "N" if latitude > 0 else "S")
