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
class HistoryRecord:
    """A quantity of a noisy field, followed in time.

    Attributes
    ----------
    followed : what is shown, as in "displacement since t = 0"; empty where it is the quantity itself
    units : of what is shown
    t : float array (K,), increasing, units of time
    fan : float array (5, K), quantiles 0.05, 0.25, 0.5, 0.75 and 0.95 over the realizations; NaN at a time at
        which the quantity occurs in none
    paths : float array (P, K), P <= 6, single realizations; NaN where the quantity does not occur
    realizations : how many realizations the fan is taken from
    """

    followed: str
    units: str
    t: FloatArray
    fan: FloatArray
    paths: FloatArray
    realizations: int


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
    noise : as in "gaussian (strength 0.02 mV, correlation length 0.5 mm), 65 modes of a ring of 40 mm"; None
        without noise
    bridged : quantities that see extremes or passages of the noisy path inside its steps
    dependence : how the inputs depend on one another, as in "rank correlation 0.6 of h and rate.gain"; empty where
        they are independent
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
    noise: str | None = None
    bridged: tuple[str, ...] = ()
    dependence: str = ""


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
    inputs : by path, float array (I,), I <= S', of the first of the same samples, as many as pictures need
    fields : FieldRecord, or None where mean or spread of the field is not finite
    histories : HistoryRecord by quantity, for the quantities of a noisy field that are followed in time
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
    inputs: Mapping[str, FloatArray] = field(default_factory=dict)
    fields: FieldRecord | None = None
    histories: Mapping[str, HistoryRecord] = field(default_factory=dict)
