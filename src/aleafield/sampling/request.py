"""What a study asks of the sampling."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

SamplingMethod = Literal["monte carlo", "quasi-monte carlo"]
"""How the points of the samples are drawn."""
AskedMethod = Literal["auto", "monte carlo", "quasi-monte carlo", "polynomial chaos"]
"""What a study may ask for: a way to draw points, or a surrogate fitted to them."""


@dataclass(frozen=True)
class SamplingRequest:
    """Method and number of parameter samples as the study asks for them.

    Attributes
    ----------
    method : AskedMethod
    samples : int
        Parameter samples asked for; `allocation` rounds them where the method needs it.
    noise_repeats : int
        Noise paths of each parameter sample.
    """

    method: AskedMethod = "auto"
    samples: int = 1024
    noise_repeats: int = 1
