"""What a study asks of the sampling."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

SamplingMethod = Literal["monte carlo", "quasi-monte carlo"]


@dataclass(frozen=True)
class SamplingRequest:
    """Method and number of parameter samples as the study asks for them.

    Attributes
    ----------
    method : "auto", "monte carlo" or "quasi-monte carlo"
    samples : int
        Parameter samples asked for; `allocation` rounds them where the method needs it.
    noise_repeats : int
        Noise paths of each parameter sample.
    """

    method: Literal["auto", "monte carlo", "quasi-monte carlo"] = "auto"
    samples: int = 1024
    noise_repeats: int = 1
