"""Sentences of the methods paragraph on surrogates, and on which input causes the spread."""

from __future__ import annotations

from collections.abc import Sequence

from aleafield.report.data import ReportData
from aleafield.report.findings import quantity_findings
from aleafield.report.influence import Influence, influences, measurements
from aleafield.report.parts import FIRST, SHAPLEY, TOTAL
from aleafield.report.sources import Citations
from aleafield.report.verdict import from_surrogate, listed


def surrogate(data: ReportData, cite: Citations) -> str:
    """How the surrogate was made, judged and used; empty where none was asked for and none was used."""
    stated = [found.name for found in quantity_findings(data.summary) if from_surrogate(found.all())]
    indexed = [found.quantity for found in influences(data.summary) if from_surrogate(found.all())]
    used = sorted({*stated, *indexed})
    sampling = data.summary["sampling"]
    if not used:
        refused = sampling is not None and sampling.get("asked") == "polynomial chaos"
        return (
            "Polynomial chaos was asked for, but no surrogate passed its test: all statistics come from the solver's "
            "own runs. "
            if refused
            else ""
        )
    held_out = sampling.get("further_runs", {}).get("held out")
    runs = "runs" if held_out is None else f"{held_out} further runs"
    text = (
        f"For {listed(used)} a polynomial chaos expansion {cite('homogeneous chaos', 'chaos')} stands for the solver: "
        "polynomials that are orthonormal for the laws of the inputs, fitted by least squares to the samples; degree "
        "and terms were chosen by the error of left-out samples. It was accepted because that error and the error on "
        f"{runs} at independent points that fitted nothing both stayed below 5 % of the variance (1 % for quantiles "
        "and probabilities). What these runs show of its error is the part surrogate of all that it gives. "
    )
    if stated:
        text += (
            f"Mean and standard deviation of {listed(stated)} follow from its coefficients, quantiles and "
            "probabilities, where it is accurate enough for them, from evaluating it at many points. "
        )
    if data.model.dependence:
        text += (
            "Inputs that depend on one another were first mapped to independent normal variables "
            f"{cite('rosenblatt')}. "
        )
    return text


def causes(data: ReportData, cite: Citations) -> str:
    """How the influence of the inputs was found; empty where it was not asked for."""
    found, wanted = influences(data.summary), measurements(data.summary)
    if not found and not wanted:
        return ""
    text = ""
    kinds = {kind for one in found for kind in one.kinds}
    if kinds & {FIRST, TOTAL} or any(one.pairs for one in found):
        text += _indices(data, found, cite)
    if SHAPLEY in kinds:
        text += (
            f"Shapley effects {cite('shapley', 'shapley algorithm')} share the variance among inputs: each gets the "
            "mean, over all orders in which inputs may become known, of what it explains beyond those before it. They "
            "were computed from the surrogate over all subsets of inputs, in normal variables with the inputs' "
            "correlation. "
        )
    if wanted:
        text += (
            "The standard deviation expected to stay once an input is known is that of the variance less its "
            "first-order part; halving the spread of an input means to learn in which half of its law it lies. "
            "An input may be fixed where the upper end of its total index at one-sided 95 % lies below the threshold "
            f"of the study {cite('primer')}. Sets to pin down rest on the lower ends of what they explain. "
        )
    return text


def _indices(data: ReportData, found: Sequence[Influence], cite: Citations) -> str:
    """Where Sobol' indices come from: the surrogate, the samples themselves, runs that exchange inputs."""
    text = (
        f"First-order and second-order indices are those of Sobol' {cite('sobol indices')}, total ones those of Homma "
        f"and Saltelli {cite('total index')}. "
    )
    expanded = [one.quantity for one in found if from_surrogate(one.all())]
    sampled = [one.quantity for one in found if one.quantity not in expanded]
    if expanded:
        text += f"Those of {listed(expanded)} were read off the coefficients of the expansion {cite('chaos indices')}. "
    if not sampled:
        return text
    text += (
        f"First-order indices of {listed(sampled)} come from the samples themselves: the squared projections of the "
        "quantity on functions of one input, as products of independent groups of samples, so that chance adds "
        "nothing to them. "
    )
    runs = data.summary["sampling"].get("further_runs", {}).get("exchange")
    if runs:
        rows = runs // (2 * len(data.summary["inputs"]) + 1)
        text += (
            f"Total and second-order indices come from {runs} further runs: {rows} pairs of points between which "
            f"single inputs were exchanged, both ways, with symmetric estimators that hold differences only "
            f"{cite('exchange', 'saltelli')}; intervals by a jackknife over the scramblings. "
        )
    if data.model.noise is not None:
        text += (
            "Of the noise only its total share is stated; its own first-order index, and the total indices of the "
            "inputs beside it, depend on how paths are shared between samples and are no property of the model. "
        )
    return text
