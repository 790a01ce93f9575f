"""What can be said of a study before any time is spent: hypotheses, orders, resolution, samples."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from aleafield.errors import InputError
from aleafield.field.equation import FieldEquation
from aleafield.field.kernels import CosineKernel
from aleafield.forward.field_model import FieldModel
from aleafield.projection.discretisation import Discretisation
from aleafield.projection.pairing import Pairing
from aleafield.runs.hypotheses import Hypothesis, hypotheses
from aleafield.runs.model import Choices, design_of, field_model, noise_modes
from aleafield.runs.noise_words import noise_warnings, noise_words
from aleafield.runs.plan_file import count_probes
from aleafield.runs.resolution import COARSE, MeshWidth, Stability, domain_notes, mesh_width, stability
from aleafield.runs.stages import further_runs, refuse_impossible_runs
from aleafield.sampling.allocation import Allocation, allocate
from aleafield.study.positions import located
from aleafield.study.study import Study

FIRST_SAMPLES = 64
"""Samples over which slopes, kernel masses and widths are taken."""
MANY_STEPS = 20_000
"""Steps from which a run is called long."""
MOST_DRAWN = 1 << 16
"""Samples drawn to look for impossible numbers."""


@dataclass(frozen=True)
class CheckResult:
    """Everything that `check` says of a valid study.

    Attributes
    ----------
    title, digest : str
    inputs : tuple of mappings: path, law, units, mean, sd
    hypotheses : tuple of Hypothesis
    scheme : mapping: projector, method, nodes, rule, quadrature_points, expected orders, operator
    time : mapping: step, steps, times on the schedule, largest stable step
    resolution : mapping: gaps of nodes and points, smallest kernel width, their ratio
    sampling : mapping: method, samples, replicates, probes and what their extra levels cost, the most further runs
    noise : mapping or None: correlation, modes, ring length, dropped share of the variance, error of the images
    notes : tuple of str
        What to know; nothing is wrong.
    warnings : tuple of str
        What is wasteful, harmful or breaks a hypothesis.
    """

    title: str
    digest: str
    inputs: tuple[Mapping[str, Any], ...]
    hypotheses: tuple[Hypothesis, ...]
    scheme: Mapping[str, Any]
    time: Mapping[str, Any]
    resolution: Mapping[str, Any]
    sampling: Mapping[str, Any]
    noise: Mapping[str, Any] | None
    notes: tuple[str, ...]
    warnings: tuple[str, ...]

    def as_json(self) -> dict[str, Any]:
        """Plain values for one JSON document; no NaN, no Infinity."""
        content: dict[str, Any] = _without_infinities({"schema": 1, "valid": True, **asdict(self)})
        return content

    def as_text(self) -> str:
        """Lines for a terminal."""
        lines = [f"{self.title}: the study is valid.", "", "Inputs"]
        width = max((len(entry["path"]) for entry in self.inputs), default=0)
        for entry in self.inputs:
            unit = "" if entry["units"] == "1" else f" {entry['units']}"
            spread = f"mean {entry['mean']:.4g}, sd {entry['sd']:.4g}{unit}"
            lines.append(f"  {entry['path']:<{width}}  {entry['law']}  ({spread})")
        if not self.inputs:
            lines.append("  none: every number is certain")
        lines += ["", "Hypotheses of the convergence theory"]
        lines += [f"  {h.verdict:<13} {h.name}: {h.reason}" for h in self.hypotheses]
        scheme, time, sampling = self.scheme, self.time, self.sampling
        lines += [
            "",
            "Scheme",
            f"  {scheme['projector']} {scheme['method']}, {scheme['nodes']} nodes; {scheme['rule']} rule, "
            f"{scheme['quadrature_points']} points; kernel: {scheme['kernel']}",
        ]
        lines += [f"  {part}: order {o['text']}: {o['reason']}" for part, o in scheme["orders"].items()]
        lines.append(f"  operator: {scheme['operator']['name']}: {scheme['operator']['reason']}")
        lines += [f"  {line}" for line in self.resolution["words"]]
        lines += ["", "Time", *(f"  {line}" for line in time["words"])]
        if self.noise is not None:
            lines += ["", "Noise", *(f"  {line}" for line in self.noise["words"])]
        lines += ["", "Samples", *(f"  {line}" for line in sampling["words"])]
        for heading, entries in (("Notes", self.notes), ("Warnings", self.warnings)):
            if entries:
                lines += ["", heading, *(f"  - {entry}" for entry in entries)]
        return "\n".join(lines) + "\n"


def _without_infinities(value: Any) -> Any:
    """JSON has no NaN and no infinity: null stands for them."""
    if isinstance(value, Mapping):
        return {key: _without_infinities(entry) for key, entry in value.items()}
    if isinstance(value, tuple | list):
        return [_without_infinities(entry) for entry in value]
    return None if isinstance(value, float) and not math.isfinite(value) else value


def check(study: Study) -> CheckResult:
    """Look at a study without solving anything.

    Raises
    ------
    InputError
        Where an expression gives an impossible number for one of the samples, or a level of the error split
        cannot be built.
    """
    try:
        with np.errstate(all="ignore"):
            return _checked(study)
    except InputError as error:
        raise located(error, study.source.path, study.source.lines) from None


def _checked(study: Study) -> CheckResult:
    allocation = allocate(study.sampling, len(study.inputs), study.equation.noise is not None)
    design = design_of(study, allocation)
    refuse_impossible_runs(study, design, allocation, MOST_DRAWN)
    first = np.arange(min(FIRST_SAMPLES, allocation.samples), dtype=np.int64)
    bound = study.equation.bind(study.equation.binding(design.values(first)))
    step = study.scheme.time_step
    trial = float(np.min(np.asarray(bound.dynamics.time_constant))) / 2
    noise = noise_modes(study, allocation)
    model = field_model(study, allocation, Choices(trial if step is None else step, {}, noise))
    discretisation = model.discretisation(model.level)
    widths, stable = mesh_width(discretisation, bound), stability(discretisation, bound)
    unit = "" if study.units.length == "1" else f" {study.units.length}"
    return CheckResult(
        title=study.title,
        digest=study.digest,
        inputs=tuple(
            {"path": i.path, "law": i.law.text, "units": i.units, "mean": i.law.mean, "sd": i.law.sd}
            for i in study.inputs
        ),
        hypotheses=tuple(hypotheses(study.equation, model)),
        scheme=_scheme(model.pairing, discretisation),
        time=_time(study, model, stable),
        resolution=_resolution(widths, unit),
        sampling=_sampling(study, allocation, model),
        noise=None if noise is None else noise_words(study, noise, unit),
        notes=(*_lumping(model.pairing), *_dependence(study), *domain_notes(bound, unit)),
        warnings=(
            *study.warnings,
            *noise_warnings(study, noise),
            *_start(discretisation, bound, len(first)),
            *_warnings(study, model.pairing, widths, stable),
        ),
    )


def _scheme(pairing: Pairing, discretisation: Discretisation) -> dict[str, Any]:
    parts = (("quadrature", pairing.quadrature), ("space", pairing.space), ("time", pairing.time))
    choice = discretisation.operator_choice
    return {
        "projector": pairing.projector,
        "method": pairing.method,
        "nodes": pairing.nodes,
        "rule": pairing.rule,
        "quadrature_points": pairing.quadrature_points,
        "kernel": pairing.kernel_use,
        "orders": {
            name: {"order": e.order, "text": e.text, "observed_only": e.observed_only, "reason": e.reason}
            for name, e in parts
        },
        "operator": {"name": choice.name, "error": choice.error, "reason": choice.reason},
    }


def _time(study: Study, model: FieldModel, stable: Stability) -> dict[str, Any]:
    unit = "" if study.units.time == "1" else f" {study.units.time}"
    step = study.scheme.time_step
    steps = None if step is None else len(model.schedule())
    words = [
        "step chosen by pilots when the run starts"
        if step is None
        else f"{steps} steps of at most {model.schedule().longest:.4g}{unit}",
        "on the schedule: " + ", ".join(f"{t:g}" for t in model.schedule_times) + unit,
        f"an explicit step is stable up to about {stable.largest_step:.4g}{unit} (smallest time constant "
        f"{stable.time_constant:.4g}{unit}, "
        + (
            "slope of the rate not known, decay alone)" if stable.gain is None else f"gain {stable.gain:.3g})"
        ),
    ]
    return {
        "step": step,
        "steps": steps,
        "fixed": list(model.schedule_times),
        "largest_stable_step": stable.largest_step,
        "gain": stable.gain,
        "smallest_time_constant": stable.time_constant,
        "words": words,
    }


def _resolution(widths: MeshWidth, unit: str) -> dict[str, Any]:
    words = [f"largest gap between nodes {widths.nodes:.4g}{unit}, between points {widths.points:.4g}{unit}"]
    if widths.kernel is not None:
        gaps = widths.kernel / max(widths.nodes, widths.points)
        words.append(f"smallest kernel width {widths.kernel:.4g}{unit} ({widths.part}), {gaps:.3g} gaps")
    return {
        "node_gap": widths.nodes,
        "point_gap": widths.points,
        "smallest_kernel_width": widths.kernel,
        "gap_over_width": widths.ratio,
        "words": words,
    }


def _sampling(study: Study, allocation: Allocation, model: FieldModel) -> dict[str, Any]:
    probes, share = count_probes(model, model.level, model.path(model.level), allocation.samples)
    words = [f"{allocation.samples} samples, {allocation.method}"]
    if allocation.replicates > 1:
        words[0] += f": {allocation.replicates} scramblings of {allocation.points_per_replicate} points"
    if allocation.repeats > 1:
        words.append(f"{allocation.repeats} noise paths each: {allocation.realizations} solver runs")
    if allocation.note:
        words.append(allocation.note)
    cost = f"about {100 * share:.0f} % of the cost of the samples (counted)"
    words.append(f"error split on the first {probes} of them, {cost}")
    if model.noise is not None:
        words.append("more where pilots show that differences between levels are noisy")
    further = further_runs(study, allocation)
    if "held out" in further:
        words.append(f"{further['held out']} further runs judge the surrogate")
    if "exchange" in further:
        words.append(f"{further['exchange']} more for total indices, where no surrogate is accepted")
    return {
        "method": allocation.method,
        "samples": allocation.samples,
        "replicates": allocation.replicates,
        "noise_repeats": allocation.repeats,
        "probes": probes,
        "probe_share": share,
        "further_runs": further,
        "words": words,
    }


def _lumping(pairing: Pairing) -> list[str]:
    if pairing.inner_rule == "trapezoid" and pairing.nodes == pairing.quadrature_points:
        return ["piecewise linear galerkin with the trapezoid rule lumps the mass matrix: it is collocation"]
    return []


def _dependence(study: Study) -> list[str]:
    notes = [f"rank correlation of {a} and {b}: {rho:g}" for a, b, rho in study.dependence.rank_correlation]
    if study.dependence.sampled_together:
        notes.append("columns of one file are drawn together, whole rows at a time")
    return notes


def _start(discretisation: Discretisation, bound: FieldEquation, samples: int) -> list[str]:
    """Whether a sample starts from, or is at once driven to, what is not finite."""
    with np.errstate(all="ignore"):
        system = discretisation.system(bound, samples)
        state = system.initial()
        change = system.rate_of_change(0.0, state, 0.0)
    found = []
    for name, values in (("initial", state), ("drive", change)):
        lost = int((~np.isfinite(values)).any(axis=1).sum())
        if lost:
            found.append(
                f"{name}: not finite at t = 0 in {lost} of the first {samples} samples, which will fail"
            )
            break
    return found


def _warnings(study: Study, pairing: Pairing, widths: MeshWidth, stable: Stability) -> list[str]:
    found = []
    step = study.scheme.time_step
    if step is not None and step > stable.largest_step:
        found.append(
            f"scheme.time_step: {step:g} is beyond the stable step, about {stable.largest_step:.4g}: "
            "the numbers may oscillate or blow up"
        )
    duration = study.equation.dynamics.duration
    if duration > MANY_STEPS * stable.largest_step:
        found.append(
            f"dynamics: a stable step of about {stable.largest_step:.4g} cuts the duration {duration:g} into "
            f"more than {MANY_STEPS:,} steps"
        )
    if widths.ratio is not None and widths.ratio > COARSE and pairing.kernel_use != "exact symbol":
        found.append(
            f"scheme.nodes: a gap of {max(widths.nodes, widths.points):.4g} is {widths.ratio:.2g} of the "
            f"smallest kernel width {widths.kernel:.4g} ({widths.part}): the mesh hardly sees it"
        )
    if study.equation.domain.periodic:
        for name, part in study.equation.kernel.parts.items():
            if isinstance(part, CosineKernel) and 2 * (len(part.coefficients) - 1) > pairing.nodes:
                found.append(
                    f"{study.equation.kernel.path(name)}: {pairing.nodes} nodes hold waves up to "
                    f"{pairing.nodes // 2}, the kernel has {len(part.coefficients) - 1}"
                )
    return found
