"""Sentences of the methods paragraph that a noisy field needs besides those of a deterministic one."""

from __future__ import annotations

from aleafield.report.data import ReportData
from aleafield.report.findings import with_units
from aleafield.report.markup import Markup
from aleafield.report.rounding import short, typographic
from aleafield.report.sources import Citations

EQUATION = Markup(
    "<i>τ</i> d<i>u</i> = (\N{MINUS SIGN}<i>u</i> + ∫<sub><i>D</i></sub> <i>w</i>(<i>x</i>, <i>y</i>) "
    "<i>f</i>(<i>u</i>(<i>y</i>, <i>t</i>)) d<i>y</i> + <i>ξ</i>(<i>x</i>, <i>t</i>)) d<i>t</i> + "
    "<i>\N{GREEK SMALL LETTER SIGMA}</i> d<i>W</i>(<i>x</i>, <i>t</i>), "
    "<i>u</i>(<i>x</i>, 0) = <i>u</i><sub>0</sub>(<i>x</i>)"
)
"""The field equation with noise as the page sets it."""


def process(data: ReportData, cite: Citations) -> str:
    """What the noise is."""
    white = data.summary["scheme"]["noise"]["correlation"] == "white"
    law = "δ(x \N{MINUS SIGN} y)" if white else "C(|x \N{MINUS SIGN} y|)"
    scaled = "" if white else ", C(0) = 1"
    return (
        f" W is a Wiener process {cite('equations')} with covariance Cov[W(x, s), W(y, t)] = min(s, t) {law}"
        f"{scaled}; the noise is {data.model.noise}."
    )


def modes(data: ReportData) -> str:
    """How the noise was cut into modes."""
    noise, units = data.summary["scheme"]["noise"], data.units
    ring = with_units(short(noise["ring_length"], 6), units.length)
    text = (
        f"W was expanded in {noise['modes']} sines and cosines of a ring of length {ring}, the same functions at "
        "every level, and projected like every other term"
    )
    if noise["dropped_share"]:
        text += f"; the modes left out hold {_small(noise['dropped_share'])} of its variance"
    if noise["image_error"]:
        text += f"; that the ring repeats itself changes C on the domain by at most {_small(noise['image_error'])}"
    return f"{text}. {noise['note']}".rstrip(" .") + ". "


def steps(data: ReportData, step: str, cite: Citations) -> str:
    """How time was stepped, and how the path inside a step was seen."""
    text = (
        f"In time the Euler-Maruyama method {cite('euler maruyama')} took {data.model.steps} steps of at most "
        f"{step}, on a schedule that is the same for all realizations and holds every time at which the drive "
        "switches or a quantity is read. The increments of a mode were built by halving: those of a long step are "
        "the sums of those of its parts, so that all levels of mesh, modes and step follow the same paths"
    )
    if data.model.bridged:
        text += (
            f". Between the ends of a step {', '.join(data.model.bridged)} saw the extremes and first passages of "
            f"the Brownian bridge, drawn from their exact law {cite('passage')}"
        )
    return f"{text}."


def paths(data: ReportData, cite: Citations) -> str:
    """How many noise paths there are and where they come from."""
    repeats = data.summary["sampling"]["noise_repeats"]
    each = "one noise path" if repeats == 1 else f"{repeats} independent noise paths"
    return (
        f"Each sample had {each}, regenerated wherever needed from a counter-based generator {cite('philox')}"
    )


def dropped_modes(data: ReportData) -> str:
    """How the error of the modes that were left out was bounded; empty where it was not."""
    scheme = data.summary["scheme"]
    if "noise_modes" not in scheme["parts"]:
        return ""
    known = "1.25 s(m)/(s(m) \N{MINUS SIGN} s(2m + 1)), s the share of the variance that m modes drop, which is known"
    return (
        "The modes that were left out were judged on the same samples and paths with twice the modes: the difference "
        f"was multiplied by {known if scheme['noise']['dropped_share'] else '1.25'}. "
    )


def clusters(data: ReportData) -> str:
    """How repeated noise paths enter the sampling intervals; empty without repeats."""
    if data.summary["sampling"]["noise_repeats"] == 1:
        return ""
    return (
        "Runs that share their inputs are not independent: in all intervals the samples with all their noise "
        "paths, and not the single runs, are the units. "
    )


def analysis_of_variance(data: ReportData, cite: Citations) -> str:
    """How the variance was parted; empty where it was not."""
    sampling = data.summary["sampling"]
    if sampling["noise_repeats"] == 1 or not data.summary["inputs"]:
        return ""
    text = (
        "The variance was parted by a balanced one-way analysis of variance: the mean variance within a sample is "
        "due to noise, and the variance of the samples' means less its share of the noise is due to the "
        "parameters, without bias. "
    )
    if sampling["method"] == "quasi-monte carlo":
        return text + "Its intervals come from a jackknife over the scramblings. "
    return (
        f"{text}Intervals: of the part of the noise by a jackknife of its logarithm over samples; of the part of the "
        f"parameters by Williams {cite('components')}, and of its share from the ratio of the mean squares, both with "
        "degrees of freedom that heavy tails lower; of the total as of the standard deviation. "
    )


def _small(share: float) -> str:
    return typographic(short(share, 2))
