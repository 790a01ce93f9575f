"""Colours: variables for light and dark surroundings, and two scales for maps.

The colours of the error parts stay apart for readers who confuse red and green or blue and yellow; the maps
run through lightness (spread) or from blue over pale to rust (a field that takes both signs).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from aleafield.arrays import FloatArray

Bytes = NDArray[np.uint8]

LIGHT: Mapping[str, str] = {
    "paper": "#fdfcf9",
    "panel": "#ffffff",
    "ink": "#1d2430",
    "quiet": "#5b6573",
    "line": "#d9d8d0",
    "grid": "#eceae3",
    "accent": "#1c5d99",
    "accent-soft": "#c9dcec",
    "mark": "#b4531a",
    "alarm": "#a3262a",
    "part-space": "#17457f",
    "part-quadrature": "#5aa9db",
    "part-time": "#0f7562",
    "part-noise-modes": "#d2b13c",
    "part-surrogate": "#4a1f3d",
    "part-bias-noise": "#c9ccd1",
    "part-sampling": "#dd6b2f",
    "part-parameters": "#1c5d99",
    "part-noise": "#d9c48b",
    "part-index-first": "#17457f",
    "part-index-total": "#5aa9db",
    "part-index-shapley": "#b4531a",
    "on-part-space": "#ffffff",
    "on-part-quadrature": "#10202c",
    "on-part-time": "#ffffff",
    "on-part-noise-modes": "#1f1a05",
    "on-part-surrogate": "#ffffff",
    "on-part-bias-noise": "#15191e",
    "on-part-sampling": "#1d0f07",
    "on-part-parameters": "#ffffff",
    "on-part-noise": "#211b0a",
    "on-part-index-first": "#ffffff",
    "on-part-index-total": "#10202c",
    "on-part-index-shapley": "#ffffff",
}
"""Colour variables on a light ground."""

DARK: Mapping[str, str] = {
    **LIGHT,
    "paper": "#14181f",
    "panel": "#1b212a",
    "ink": "#e8e6e0",
    "quiet": "#9fa8b4",
    "line": "#3a434f",
    "grid": "#28303a",
    "accent": "#7db7e8",
    "accent-soft": "#2b4a66",
    "mark": "#f0a06a",
    "alarm": "#f08a86",
    "part-space": "#3f74bd",
    "part-quadrature": "#6fb6e0",
    "part-time": "#2fa58c",
    "part-surrogate": "#8c4a7c",
    "part-parameters": "#3573b0",
    "part-noise": "#cdb87e",
    "part-index-first": "#3f74bd",
    "part-index-total": "#8ecbf0",
    "part-index-shapley": "#d0703a",
    "on-part-time": "#06201a",
    "on-part-index-shapley": "#1d0f07",
}
"""The same variables on a dark ground."""

_SPREAD = ("#f6f2e6", "#c3dfc9", "#6fb8b0", "#3486a0", "#235583", "#1a2a52")
_BOTH_SIGNS = ("#12345c", "#3a7db0", "#a9cfe2", "#f5f2ea", "#efc596", "#cc7431", "#70290c")


def css_variables() -> str:
    """Style rules that define the variables for both surroundings."""
    light = "".join(f"--{name}:{colour};" for name, colour in LIGHT.items())
    dark = "".join(f"--{name}:{colour};" for name, colour in DARK.items() if LIGHT[name] != colour)
    return f":root{{color-scheme:light dark;{light}}}@media (prefers-color-scheme:dark){{:root{{{dark}}}}}"


def linear_light(colours: Sequence[str]) -> FloatArray:
    """Hexadecimal sRGB colours as linear light, shape (len, 3), within [0, 1] (IEC 61966-2-1)."""
    encoded = np.array([[int(c[i : i + 2], 16) / 255 for i in (1, 3, 5)] for c in colours])
    return np.where(encoded <= 0.04045, encoded / 12.92, ((encoded + 0.055) / 1.055) ** 2.4)


def _encoded(linear: FloatArray) -> Bytes:
    linear = np.clip(linear, 0.0, 1.0)
    curve = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)
    return np.asarray(np.rint(255 * curve), dtype=np.uint8)


_CONES = np.array(
    [
        [0.4122214708, 0.5363325363, 0.0514459929],
        [0.2119034982, 0.6806995451, 0.1073969566],
        [0.0883024619, 0.2817188376, 0.6299787005],
    ]
)
_OPPONENT = np.array(
    [
        [0.2104542553, 0.7936177850, -0.0040720468],
        [1.9779984951, -2.4285922050, 0.4505937099],
        [0.0259040371, 0.7827717662, -0.8086757660],
    ]
)


def perceptual(linear: FloatArray) -> FloatArray:
    """Linear light in Oklab coordinates (lightness, green-red, blue-yellow), shape (.., 3).

    Equal distances look about equally large (Ottosson 2020, A perceptual color space; constants from memory).
    """
    return np.asarray(np.cbrt(linear @ _CONES.T) @ _OPPONENT.T)


def _from_perceptual(lab: FloatArray) -> FloatArray:
    cones = (lab @ np.linalg.inv(_OPPONENT).T) ** 3
    return np.asarray(cones @ np.linalg.inv(_CONES).T)


def map_colours(both_signs: bool) -> Bytes:
    """The 256 colours of a map, shape (256, 3): for a spread, or for values of both signs about 0."""
    anchors = perceptual(linear_light(_BOTH_SIGNS if both_signs else _SPREAD))
    position = np.linspace(0, len(anchors) - 1, 256)
    lab = np.stack([np.interp(position, np.arange(len(anchors)), anchors[:, i]) for i in range(3)], axis=1)
    return _encoded(_from_perceptual(lab))
