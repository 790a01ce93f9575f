"""What `check` says of a study's noise."""

from __future__ import annotations

from typing import Any

from aleafield.field.noise_modes import NoiseModes
from aleafield.study.study import Study


def noise_words(study: Study, noise: NoiseModes, unit: str) -> dict[str, Any]:
    """What `check` says of the noise: correlation, modes, ring length, dropped share, error of the images.

    Parameters
    ----------
    study : Study
        With noise.
    noise : NoiseModes
    unit : label of lengths, with a leading space, or empty
    """
    assert study.equation.noise is not None
    correlation = study.equation.noise.correlation.name
    ring = f"{noise.modes} modes of a ring of length {noise.length:.5g}{unit}"
    if noise.dropped is None:
        words = [f"{correlation}: {ring}"]
    else:
        words = [f"{correlation} correlation: {ring} leave out {noise.dropped:.2g} of the variance"]
    if noise.image_error > 0:
        words.append(f"the images on that ring change the correlation by less than {noise.image_error:.1g}")
    words.append("Euler-Maruyama: strong order 1 for additive noise and a smooth rate")
    return {
        "correlation": correlation,
        "modes": noise.modes,
        "ring_length": noise.length,
        "dropped_share": noise.dropped,
        "image_error": noise.image_error,
        "words": words,
    }


def noise_warnings(study: Study, noise: NoiseModes | None) -> list[str]:
    """What noise makes of the field and of single quantities that a user should know."""
    if noise is None:
        return []
    found = [noise.note] if noise.note else []
    if noise.white:
        found.append(
            "noise.correlation: white in space: mean and spread of the field at a point, as stored and drawn, "
            "belong to this mesh and grow like 1 / h"
        )
    for quantity in study.quantities:
        if quantity.open_side is not None or quantity.open_occurrence is not None:
            found.append(
                f"{quantity.key('over')}: between the ends of steps a noisy path is not seen, and what it does there "
                "shrinks like the root of the step only: one side of the intervals stays open"
            )
    return found
