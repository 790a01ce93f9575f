"""What a report is written from: the summary, the study's words and the arrays that pictures need."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from aleafield.arrays import FloatArray
from aleafield.units import Units

Summary = Mapping[str, Any]
"""summary.json as read: numbers, text, lists and mappings; None where a part does not apply."""


@dataclass(frozen=True)
class FieldRecord:
    """The field over the ensemble.

    Attributes
    ----------
    t : float array (K,), increasing, units of time
    x : float array (n,), increasing, units of length
    mean, sd : float array (K, n), over all samples that did not fail, units of activity
    band : float array (4, K, n), quantiles 0.05, 0.25, 0.75 and 0.95; NaN where there is none
    band_samples : how many samples the band is taken from
    """

    t: FloatArray
    x: FloatArray
    mean: FloatArray
    sd: FloatArray
    band: FloatArray
    band_samples: int


@dataclass(frozen=True)
class ModelText:
    """The field in the words of its study, and how its integral and its time derivative were treated.

    Attributes
    ----------
    domain : as in "the ring of length 10 mm"
    kernel : by part ("" for a lone kernel), as in "gaussian (strength 1.4 mV, width 1 mm)"
    rate, drive, initial : the same
    time_constant, duration : with units
    integrals : a clause, as in "integrals were taken by the trapezoid rule with 257 points"
    steps : number of steps of the run's schedule
    """

    domain: str
    kernel: Mapping[str, str]
    rate: str
    drive: str
    initial: str
    time_constant: str
    duration: str
    integrals: str
    steps: int


@dataclass(frozen=True)
class Provenance:
    """Where the numbers come from.

    Attributes
    ----------
    seed : of the study
    digest : of the study, hexadecimal
    versions : by name of the software
    """

    seed: int
    digest: str
    versions: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class ReportData:
    """Everything a report shows.

    Attributes
    ----------
    title, about : the study's own words
    units : labels of length, time and activity
    study_text : exact text of the study
    summary : as in summary.json
    measures : name of the measure by quantity
    model : ModelText
    provenance : Provenance
    values : by quantity, float array (S',) of the stored samples or the first of them; NaN where the quantity
        does not occur or the sample failed
    fields : FieldRecord, or None where mean or spread of the field is not finite
    """

    title: str
    units: Units
    study_text: str
    summary: Summary
    model: ModelText
    provenance: Provenance
    about: str = ""
    measures: Mapping[str, str] = field(default_factory=dict)
    values: Mapping[str, FloatArray] = field(default_factory=dict)
    fields: FieldRecord | None = None
