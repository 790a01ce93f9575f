"""The methods paragraph, its numbers filled in, for an author to put into a paper; and its sources."""

from __future__ import annotations

from dataclasses import dataclass

from aleafield.report.data import ReportData
from aleafield.report.findings import quantity_findings, with_units
from aleafield.report.markup import Markup, element, escaped, joined
from aleafield.report.rounding import short, typographic
from aleafield.report.verdict import confidence_text, main_parts

EQUATION = Markup(
    "<i>τ</i> ∂<i>u</i>/∂<i>t</i> = \N{MINUS SIGN}<i>u</i> + ∫<sub><i>D</i></sub> "
    "<i>w</i>(<i>x</i>, <i>y</i>) <i>f</i>(<i>u</i>(<i>y</i>, <i>t</i>)) d<i>y</i> + "
    "<i>ξ</i>(<i>x</i>, <i>t</i>), <i>u</i>(<i>x</i>, 0) = <i>u</i><sub>0</sub>(<i>x</i>)"
)
"""The field equation as the page sets it."""

SOURCES: dict[str, str] = {
    "field": "Amari, S. (1977). Dynamics of pattern formation in lateral-inhibition type neural fields. "
    "Biological Cybernetics 27, 77-87.",
    "projection": "Atkinson, K. E. (1997). The Numerical Solution of Integral Equations of the Second Kind. "
    "Cambridge University Press.",
    "runge kutta": "Hairer, E., Norsett, S. P. and Wanner, G. (1993). Solving Ordinary Differential "
    "Equations I. Springer.",
    "sobol": "Sobol', I. M. (1967). On the distribution of points in a cube and the approximate evaluation "
    "of integrals. USSR Computational Mathematics and Mathematical Physics 7, 86-112.",
    "scrambling": "Matousek, J. (1998). On the L2-discrepancy for anchored boxes. Journal of Complexity 14, "
    "527-556.",
    "philox": "Salmon, J. K., Moraes, M. A., Dror, R. O. and Shaw, D. E. (2011). Parallel random numbers: "
    "as easy as 1, 2, 3. Proceedings of SC11.",
    "wilson": "Wilson, E. B. (1927). Probable inference, the law of succession, and statistical inference. "
    "Journal of the American Statistical Association 22, 209-212.",
    "woodruff": "Woodruff, R. S. (1952). Confidence intervals for medians and other position measures. "
    "Journal of the American Statistical Association 47, 635-646.",
    "convergence": "Roache, P. J. (1994). Perspective: a method for uniform reporting of grid refinement "
    "studies. Journal of Fluids Engineering 116, 405-413.",
}
"""Published sources of the methods, from memory."""


@dataclass(frozen=True)
class Methods:
    """Paragraphs by heading, and the sources that they cite, numbered from 1."""

    paragraphs: tuple[tuple[str, Markup], ...]
    sources: tuple[str, ...]


class _Citations:
    """Numbers the sources in the order in which they are cited."""

    def __init__(self) -> None:
        self.keys: list[str] = []

    def __call__(self, *keys: str) -> str:
        for key in keys:
            if key not in self.keys:
                self.keys.append(key)
        return "[" + ", ".join(str(self.keys.index(key) + 1) for key in keys) + "]"


def methods(data: ReportData) -> Methods:
    """What was computed and how, in paragraphs that hold every number another group needs to repeat it."""
    cite = _Citations()
    paragraphs = (
        ("Model", _model(data, cite)),
        ("Discretisation", escaped(_discretisation(data, cite))),
        ("Uncertainty", escaped(_uncertainty(data, cite))),
        ("Errors", escaped(_errors(data, cite))),
        ("Software", escaped(_software(data))),
    )
    return Methods(paragraphs, tuple(SOURCES[key] for key in cite.keys))


def _model(data: ReportData, cite: _Citations) -> Markup:
    model = data.model
    parts = [f"{name}: {text}" if name else text for name, text in model.kernel.items()]
    kernel = parts[0] if len(parts) == 1 else "the sum of " + "; ".join(parts)
    return joined(
        (
            f"The activity u(x, t) follows the neural field equation {cite('field')} ",
            element("span", EQUATION, class_="equation"),
            f" on D = {model.domain}, for t from 0 to {model.duration}, with time constant "
            f"τ = {model.time_constant}. The connectivity w is {kernel}. The firing rate f is {model.rate}. "
            f"The drive is ξ = {model.drive}; the initial state is u0 = {model.initial}.",
        )
    )


def _discretisation(data: ReportData, cite: _Citations) -> str:
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
    return (
        f"{text}In time the classical Runge-Kutta method of order 4 {cite('runge kutta')} took {model.steps} "
        f"steps of at most {step}, on a schedule that is the same for all samples and holds every time at "
        "which the drive switches or a quantity is read."
    )


def _uncertainty(data: ReportData, cite: _Citations) -> str:
    summary = data.summary
    sampling, count = summary["sampling"], len(summary["inputs"])
    if sampling is None:
        return "No input of the model is uncertain; one run was made."
    samples, failed = sampling["samples"], summary["failed"]["count"]
    text = f"Uncertain inputs of the model: {count}, with the laws of the table of inputs. "
    if sampling["method"] == "quasi-monte carlo":
        text += (
            f"Quasi-Monte Carlo drew {samples} samples: {sampling['replicates']} independent scramblings "
            f"{cite('scrambling')} of a Sobol' sequence {cite('sobol')} with "
            f"{sampling['points_per_replicate']} points each"
        )
    else:
        text += f"Plain Monte Carlo drew {samples} samples from a counter-based generator {cite('philox')}"
    return (
        f"{text}, carried through the inverse distribution functions. Failed samples (a value was not "
        f"finite), which are left out: {failed}. The seed was {data.provenance.seed}."
    )


def _errors(data: ReportData, cite: _Citations) -> str:
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
    text += _sampling_error(data, cite)
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


def _sampling_error(data: ReportData, cite: _Citations) -> str:
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
