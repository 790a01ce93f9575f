"""The methods paragraph, its numbers filled in, for an author to put into a paper; and its sources."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.report import methods_of_causes, methods_of_noise
from aleafield.report.data import ReportData
from aleafield.report.findings import quantity_findings, with_units
from aleafield.report.markup import Markup, element, escaped, joined
from aleafield.report.rounding import short, typographic
from aleafield.report.sources import Citations
from aleafield.report.verdict import confidence_text, main_parts, runs_name

EQUATION = Markup(
    "<i>τ</i> ∂<i>u</i>/∂<i>t</i> = \N{MINUS SIGN}<i>u</i> + ∫<sub><i>D</i></sub> "
    "<i>w</i>(<i>x</i>, <i>y</i>) <i>f</i>(<i>u</i>(<i>y</i>, <i>t</i>)) d<i>y</i> + "
    "<i>ξ</i>(<i>x</i>, <i>t</i>), <i>u</i>(<i>x</i>, 0) = <i>u</i><sub>0</sub>(<i>x</i>)"
)
"""The field equation as the page sets it."""


@dataclass(frozen=True)
class Methods:
    """Paragraphs by heading, and the sources that they cite, numbered from 1."""

    paragraphs: tuple[tuple[str, Markup], ...]
    sources: tuple[str, ...]


def methods(data: ReportData) -> Methods:
    """What was computed and how, in paragraphs that hold every number another group needs to repeat it."""
    cite = Citations()
    paragraphs = (
        ("Model", _model(data, cite)),
        ("Discretisation", escaped(_discretisation(data, cite))),
        ("Uncertainty", escaped(_uncertainty(data, cite))),
        ("Surrogate", escaped(methods_of_causes.surrogate(data, cite))),
        ("Influence of the inputs", escaped(methods_of_causes.causes(data, cite))),
        ("Errors", escaped(_errors(data, cite))),
        ("Software", escaped(_software(data))),
    )
    return Methods(tuple(entry for entry in paragraphs if entry[1]), cite.sources())


def _model(data: ReportData, cite: Citations) -> Markup:
    model = data.model
    parts = [f"{name}: {text}" if name else text for name, text in model.kernel.items()]
    equation = EQUATION if model.noise is None else methods_of_noise.EQUATION
    kernel = parts[0] if len(parts) == 1 else "the sum of " + "; ".join(parts)
    return joined(
        (
            f"The activity u(x, t) follows the neural field equation {cite('field')} ",
            element("span", equation, class_="equation"),
            f" on D = {model.domain}, for t from 0 to {model.duration}, with time constant "
            f"τ = {model.time_constant}. The connectivity w is {kernel}. The firing rate f is {model.rate}. "
            f"The drive is ξ = {model.drive}; the initial state is u0 = {model.initial}.",
            methods_of_noise.process(data, cite) if model.noise is not None else None,
        )
    )


def _discretisation(data: ReportData, cite: Citations) -> str:
    scheme, model = data.summary["scheme"], data.model
    text = (
        f"In space the equation was projected by {scheme['projector']} {scheme['method']} with "
        f"{scheme['nodes']} nodes {cite('projection')}; {model.integrals}. "
    )
    for entry in scheme["operators"]:
        text += (
            f"The integral operator ({entry['part']}) was applied as {entry['operator']}: {entry['reason']}. "
        )
    step = with_units(short(scheme["time_step"], 6), data.units.time)
    if model.noise is not None:
        return text + methods_of_noise.modes(data) + methods_of_noise.steps(data, step, cite)
    return (
        f"{text}In time the classical Runge-Kutta method of order 4 {cite('runge kutta')} took {model.steps} "
        f"steps of at most {step}, on a schedule that is the same for all samples and holds every time at "
        "which the drive switches or a quantity is read."
    )


def _uncertainty(data: ReportData, cite: Citations) -> str:
    summary = data.summary
    sampling, count = summary["sampling"], len(summary["inputs"])
    if sampling is None:
        return "No input of the model is uncertain; one run was made."
    samples, failed = sampling["samples"], summary["failed"]["count"]
    noise = "" if data.model.noise is None else f"{methods_of_noise.paths(data, cite)}. "
    end = (
        f"Failed {runs_name(summary)} (a value was not finite), which are left out: {failed}. The seed was "
        f"{data.provenance.seed}."
    )
    if count == 0:
        return f"No input of the model is uncertain; {samples} samples differ by their noise. {noise}{end}"
    text = f"Uncertain inputs of the model: {count}, with the laws of the table of inputs. "
    if data.model.dependence:
        text += f"They depend on one another: {data.model.dependence}. "
    if sampling["method"] == "quasi-monte carlo":
        text += (
            f"Quasi-Monte Carlo drew {samples} samples: {sampling['replicates']} independent scramblings "
            f"{cite('scrambling')} of a Sobol' sequence {cite('sobol')} with "
            f"{sampling['points_per_replicate']} points each"
        )
    else:
        text += f"Plain Monte Carlo drew {samples} samples from a counter-based generator {cite('philox')}"
    return f"{text}, carried through the inverse distribution functions. {noise}{end}"


def _errors(data: ReportData, cite: Citations) -> str:
    summary = data.summary
    probes = summary["scheme"]["probes"]
    text = f"All intervals are stated at {confidence_text(summary)} confidence. "
    if probes:
        text += (
            f"Each bias of the discretisation was measured on {probes} of the samples, solved again with "
            "twice the quadrature points, then in a refined space with these points held, and with every "
            "step halved. The difference of the same samples at two levels, in the terms of the statistic "
            "(influence values for mean and standard deviation; for quantiles and probabilities a "
            "regression of the difference on the quantity), was multiplied by a factor 1 + 1.25/(q^p - 1) "
            f"in the manner of grid convergence indices {cite('convergence')}, q the ratio of the levels and "
            "p the order: the proven one where the order observed over three levels agrees with it, else a "
            "smaller order or a larger factor. "
        )
        if data.model.noise is not None:
            text += methods_of_noise.dropped_modes(data)
    text += _sampling_error(data, cite)
    if data.model.noise is not None:
        text += methods_of_noise.clusters(data) + methods_of_noise.analysis_of_variance(data, cite)
    text += (
        "The interval of a statistic T is [T - B - √(l² + N²), T + B + √(r² + N²)]: B is the sum of the "
        "bounds on the biases, l and r are the sides of the sampling interval, and N is the sampling noise "
        "of the estimated biases; its longer side is the total."
    )
    shares = [
        f"{found.name}, \N{PLUS-MINUS SIGN} {with_units(typographic(half_width), found.units)}: "
        f"{main_parts(found.mean)}"
        for found in quantity_findings(summary)
        if (half_width := found.mean.rounded.half_width) is not None
    ]
    if not shares:
        return text
    return f"{text} The half-widths of the means, with their parts of a tenth and more: {'; '.join(shares)}."


def _sampling_error(data: ReportData, cite: Citations) -> str:
    sampling = data.summary["sampling"]
    if sampling is None:
        return ""
    if sampling["method"] == "quasi-monte carlo":
        return (
            f"Sampling intervals come from the {sampling['replicates']} scramblings: Student's t for means, "
            "a jackknife of the logarithm for standard deviations, Woodruff's interval for quantiles "
            f"{cite('woodruff')}, Wilson's interval with the effective sample size for probabilities "
            f"{cite('wilson')}. "
        )
    return (
        "Sampling intervals are Student's t for means, a jackknife of the logarithm for standard deviations, "
        f"order statistics for quantiles and Wilson's interval for probabilities {cite('wilson')}. "
    )


def _software(data: ReportData) -> str:
    versions = ", ".join(f"{name} {version}" for name, version in data.provenance.versions.items())
    return (
        f"Computed with {versions or 'software of unrecorded version'}. The study's digest is "
        f"{data.provenance.digest}; with the same study, seed and software the same numbers come out again."
    )
