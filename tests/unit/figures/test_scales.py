"""Palettes and limits."""

from __future__ import annotations

import matplotlib
import numpy as np
import pytest

import gridcarb.chemistry  # noqa: F401  (declares the derived fields)
from gridcarb.fields import FIELDS, Ink
from gridcarb.figures.drawing.scales import kinds, scale_of

COLOUR_BLIND_SAFE = {"viridis", "plasma", "magma", "inferno", "cividis", "BrBG", "PuOr", "RdBu", "RdBu_r", "PRGn", "RdYlBu"}


def lightness(palette: str) -> np.ndarray:
    """CIELAB L* of a palette of matplotlib, from sRGB by the formulas of the standard (IEC 61966-2-1, CIE 15)."""
    rgb = matplotlib.colormaps[palette](np.linspace(0, 1, 256))[:, :3]
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    luminance = linear @ [0.2126, 0.7152, 0.0722]
    return np.where(luminance > 0.008856, 116 * np.cbrt(luminance) - 16, 903.3 * luminance)


@pytest.mark.parametrize("key", [key for key in FIELDS if not FIELDS[key].flags])
def test_every_field_has_a_palette_that_any_eye_can_order(key: str) -> None:
    ink = FIELDS[key].ink
    assert ink.palette in COLOUR_BLIND_SAFE
    light = lightness(ink.palette)
    if ink.centre is None:
        assert np.all(np.diff(light) > -0.2)
        assert light[-1] - light[0] > 50
    else:
        middle = int(np.argmax(light))
        assert 118 <= middle <= 138
        assert np.all(np.diff(light[:middle]) > -0.6)
        assert np.all(np.diff(light[middle:]) < 0.6)


def test_limits_are_round_and_leave_out_the_odd_value() -> None:
    values = np.concatenate([np.linspace(1902, 2188, 1000), [9000.0, np.nan]])
    scale = scale_of(values, Ink(), None)
    assert (scale.norm.vmin, scale.norm.vmax) == (1900, 2200)
    assert (scale.low, scale.high) == (False, True)
    assert all(tick in range(1900, 2201, 50) for tick in scale.ticks)


def test_stated_limits_hold_and_tell_what_passes_them() -> None:
    scale = scale_of(np.array([1.0, 5.0]), Ink(), (2.0, 6.0))
    assert (scale.norm.vmin, scale.norm.vmax, scale.low, scale.high) == (2, 6, True, False)


@pytest.mark.parametrize("values", [[0.5, 1.0, 4.0], [0.9, 1.0, 1.2]])
def test_a_centred_palette_keeps_its_middle(values: list[float]) -> None:
    scale = scale_of(np.array(values), Ink("BrBG", centre=1.0), None)
    middle = matplotlib.colormaps["BrBG"](0.5)
    assert np.allclose(scale.colours(np.array([1.0]))[0], middle, atol=0.02)
    assert 1.0 in scale.ticks


def test_sides_of_like_length_have_one_measure() -> None:
    scale = scale_of(np.linspace(0.4, 1.4, 50), Ink("BrBG", centre=1.0), (0.4, 1.4))
    assert type(scale.norm) is matplotlib.colors.Normalize
    steps = np.diff(scale.ticks)
    assert np.allclose(steps, steps[0])
    whole = matplotlib.colormaps["BrBG"]
    assert np.allclose(scale.colours(np.array([0.4, 1.4])), whole([0.0, 0.5 + 0.4 / 1.2]), atol=0.02)


def test_a_side_that_would_vanish_is_stretched_as_far_as_eyes_need() -> None:
    scale = scale_of(np.array([0.7, 4.0]), Ink("BrBG", centre=1.0), (0.7, 4.0))
    assert np.allclose(scale.colours(np.array([0.7, 4.0])), matplotlib.colormaps["BrBG"]([0.3, 1.0]), atol=0.02)
    assert 1.0 in scale.ticks


def test_values_on_one_side_use_one_half_and_no_impossible_numbers() -> None:
    above = scale_of(np.linspace(1.2, 4.4, 50), Ink("BrBG", centre=1.0), None)
    assert (above.norm.vmin, above.norm.vmax) == (1.0, 4.4)
    assert np.allclose(above.colours(np.array([4.4]))[0], matplotlib.colormaps["BrBG"](1.0))
    below = scale_of(np.linspace(0.3, 0.8, 50), Ink("BrBG", centre=1.0), None)
    assert below.norm.vmax == 1.0
    narrow = scale_of(np.linspace(3.9, 4.1, 50), Ink("BrBG", centre=1.0), None)
    assert narrow.norm.vmin > 3.8


@pytest.mark.parametrize("values", [[], [np.nan], [5.0, 5.0], [0.0, 0.0], [-3.0]])
def test_poor_data_still_make_a_scale(values: list[float]) -> None:
    scale = scale_of(np.array(values), Ink(), None)
    assert scale.norm.vmin < scale.norm.vmax
    assert np.all(np.isfinite(scale.colours(np.array([5.0]))))


def test_no_value_no_ink() -> None:
    assert scale_of(np.array([1.0, 2.0]), Ink(), None).colours(np.array([np.nan]))[0].tolist() == [0, 0, 0, 0]


def test_each_flag_has_its_colour() -> None:
    scale, colours = kinds(((0, "solved"), (1, "outside"), (4, "unsolved")))
    drawn = scale.colours(np.array([0.0, 1.0, 4.0]))
    assert [matplotlib.colors.to_hex(colour) for colour in drawn] == list(colours.values())
    assert len(set(colours.values())) == 3
