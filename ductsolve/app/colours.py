"""Colours of the pictures: ramps of even steps in perceived lightness, light where the value is low.

A ramp runs in OKLab (Ottosson 2020), in which equal distances look alike: lightness falls evenly from
paper to ink, so that it also reads in black and white, while the hue turns a little.
"""

from __future__ import annotations

import numpy as np
from matplotlib.colors import ListedColormap

INK, MESH, HATCH = "#1d2733", "#8a949e", "#e8923a"
STEPS = 256
LIGHTEST, DARKEST = 0.97, 0.33

# OKLab to linear sRGB by way of the cone responses.
_CONES = np.array(
    [[1, 0.3963377774, 0.2158037573], [1, -0.1055613458, -0.0638541728], [1, -0.0894841775, -1.2914855480]]
)
_RGB = np.array(
    [
        [4.0767416621, -3.3077115913, 0.2309699292],
        [-1.2684380046, 2.6097574011, -0.3413193965],
        [-0.0041960863, -0.7034186147, 1.7076147010],
    ]
)


def ramp(name: str, hues: tuple[float, float], chroma: float = 0.11) -> ListedColormap:
    """Ramp between two hues [degrees], palest and darkest at the ends."""
    s = np.linspace(0, 1, STEPS)
    lightness = LIGHTEST + (DARKEST - LIGHTEST) * s
    hue = np.radians(hues[0] + (hues[1] - hues[0]) * s)
    strength = chroma * np.sin(np.pi * (0.08 + 0.77 * s))  # little room for colour near white and black
    lab = np.stack([lightness, strength * np.cos(hue), strength * np.sin(hue)])
    linear = np.clip(_RGB @ (_CONES @ lab) ** 3, 0, 1)
    encoded = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)
    return ListedColormap(encoded.T, name=name)


VELOCITY = ramp("water", (170, 262))
STRESS = ramp("clay", (85, 12), chroma=0.15)
