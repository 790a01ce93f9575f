"""Reads a study file."""

from __future__ import annotations

import dataclasses
from pathlib import Path

from aleafield.errors import InputError
from aleafield.field.equation import FieldEquation
from aleafield.field.formula_term import constant as constant_term
from aleafield.projection.pairing import Pairing
from aleafield.quantities import FunctionQuantity, Quantity
from aleafield.randomness.design import Design
from aleafield.randomness.inputs import Dependence, Input
from aleafield.randomness.laws import Sampled
from aleafield.study.digest import digest_of
from aleafield.study.impossible import refuse_impossible_laws
from aleafield.study.positions import located
from aleafield.study.reading.document import Document, load, parse
from aleafield.study.reading.domain import read_domain
from aleafield.study.reading.heading import SECTIONS, read_about, read_title, read_units
from aleafield.study.reading.kernel import read_kernel
from aleafield.study.reading.noise import read_noise, refuse_pointwise
from aleafield.study.reading.numbers import Numbers
from aleafield.study.reading.quantities import QuantityReader, refuse_equal_names
from aleafield.study.reading.rate import read_rate
from aleafield.study.reading.report import read_keep, read_report
from aleafield.study.reading.sampling import read_aim, read_dependence, read_sampling
from aleafield.study.reading.scheme import read_scheme, settled
from aleafield.study.reading.sensitivity import read_sensitivity
from aleafield.study.reading.table import Table
from aleafield.study.reading.terms import read_dynamics, read_term
from aleafield.study.study import Study, StudySource


def read_study(path: str | Path) -> Study:
    """The study that a file describes.

    Raises
    ------
    InputError
        For anything in the file that cannot be used: one message with file, line, dotted key, what was found,
        what is needed, and the nearest valid name.
    """
    path = Path(path)
    return read_text(load(path), path)


def read_text(
    text: str, path: Path | None = None, extra_quantities: tuple[FunctionQuantity, ...] = ()
) -> Study:
    """The study that a text describes.

    Parameters
    ----------
    text : str
        As in a study file.
    path : Path, optional
        What messages call the file; data files are looked for beside it.
    extra_quantities : tuple of FunctionQuantity
        Functions of the field, which only Python can give; they come after the quantities of the text.

    Raises
    ------
    InputError
        As `read_study`.
    """
    document = parse(text, path)
    try:
        return _study(document, extra_quantities)
    except InputError as error:
        raise located(error, document.path, document.lines) from None


def _study(document: Document, extra: tuple[FunctionQuantity, ...]) -> Study:
    root = Table(document.data)
    root.only(SECTIONS, "a study")
    folder = None if document.path is None else document.path.parent
    title, about = read_title(root), read_about(root)
    seed = root.integer("seed", 1, most=2**63 - 1)
    parameters = root.table("parameters")
    numbers = Numbers(parameters, folder)
    domain = read_domain(root.table("domain", needed="[domain] says where the field lives"))
    kernel = read_kernel(root.table("kernel", needed="[kernel] is the connectivity"), numbers)
    rate = read_rate(root.table("rate", needed="[rate] is the firing rate"), numbers)
    equation = FieldEquation(
        domain=domain,
        kernel=kernel,
        rate=rate,
        drive=read_term(root.table("drive"), numbers, ("x", "t")) if "drive" in root else constant_term(0.0),
        initial=read_term(root.table("initial"), numbers, ("x",))
        if "initial" in root
        else constant_term(0.0),
        dynamics=read_dynamics(
            root.table("dynamics", needed="[dynamics] holds time constant and duration"), numbers
        ),
        parameters=numbers.parameters,
        noise=read_noise(root.table("noise"), numbers, domain, rate) if "noise" in root else None,
    )
    duration = equation.dynamics.duration
    scheme, pairing = settled(read_scheme(root.table("scheme"), domain, duration), equation)
    reader = QuantityReader(numbers, domain, duration, scheme.nodes)
    quantities = _quantities(root, reader, extra)
    _refuse_overshoot(pairing, quantities)
    refuse_pointwise(equation.noise, quantities)
    numbers.refuse_unused(parameters)
    names = [quantity.name for quantity in quantities]
    aim, confidence = read_aim(root.table("aim"), names)
    study = Study(
        title=title,
        about=about,
        seed=seed,
        units=read_units(root.table("units")),
        equation=equation,
        scheme=scheme,
        quantities=quantities,
        aim=aim,
        confidence=confidence,
        report=read_report(root.table("report"), names),
        keep=read_keep(root.table("keep"), duration),
        warnings=(*numbers.warnings, *pairing.notes, *pairing.warnings),
        source=StudySource(document.path, document.text, lines=document.lines),
        digest="",
    )
    return _completed(study, root)


def _quantities(
    root: Table, reader: QuantityReader, extra: tuple[FunctionQuantity, ...]
) -> tuple[Quantity, ...]:
    if extra and "quantity" not in root:
        return reader.with_functions((), extra)
    needed = "one section [[quantity]] at least, with a name and a measure"
    entries = root.value("quantity", needed=needed)
    if not isinstance(entries, list) or not entries:
        raise InputError(
            "quantity", "no list of quantities", "each quantity is a section [[quantity]], in double brackets"
        )
    return reader.with_functions(reader.read(entries), extra)


def _refuse_overshoot(pairing: Pairing, quantities: tuple[Quantity, ...]) -> None:
    """Refuse the largest and smallest values of an interpolant that overshoots alike on every mesh."""
    for quantity in quantities:
        if pairing.overshoots and quantity.takes_extremum(pairing.domain):
            raise InputError(
                quantity.key("measure"),
                f"{quantity.measure} of a field whose drive or initial state jumps in x, under the "
                f"{pairing.projector} projector",
                "its interpolant overshoots at a jump by about a tenth of it on every mesh, so that the value does "
                'not converge: use projector = "piecewise linear", or a steep smooth slope in place of the jump',
            )


def _completed(study: Study, root: Table) -> Study:
    """The study with what concerns all its inputs, its data files and digest, after the checks of the whole."""
    inputs = study.inputs
    paths = [entry.path for entry in inputs]
    noisy = study.equation.noise is not None
    refuse_equal_names(study.quantities, paths)
    sampling = read_sampling(root.table("sampling"), noisy, bool(inputs))
    dependence = read_dependence(root.table("dependence"))
    if dependence != Dependence():
        Design(inputs, dependence, "monte carlo", study.seed)  # refuses a dependence that does not fit
    sensitivity = None
    if "sensitivity" in root:
        names = [quantity.name for quantity in study.quantities]
        sensitivity = read_sensitivity(root.table("sensitivity"), names, paths, dependence, noisy)
    study = dataclasses.replace(study, sampling=sampling, dependence=dependence, sensitivity=sensitivity)
    refuse_impossible_laws(study)
    source = dataclasses.replace(study.source, data_files=_data_files(study.source.path, inputs))
    study = dataclasses.replace(study, source=source)
    return dataclasses.replace(study, digest=digest_of(study))


def _data_files(path: Path | None, inputs: tuple[Input, ...]) -> dict[str, bytes]:
    """Contents of the files that the laws name, by the name that the study gives them."""
    folder = Path() if path is None else path.parent
    files: dict[str, bytes] = {}
    for entry in inputs:
        if isinstance(entry.law, Sampled) and entry.law.path not in files:
            try:
                files[entry.law.path] = (folder / entry.law.path).read_bytes()
            except OSError as error:
                found = f"{entry.law.path} cannot be read ({error.strerror})"
                raise InputError(entry.path, found, "the path is relative to the study file") from None
    return files
