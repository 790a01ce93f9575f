"""Path by path: fields under noise converge with the step and with the mesh, through the forward model.

All levels share their noise paths, so that a difference between two levels is an error of the coarser one.  For
additive noise Euler-Maruyama is of strong order 1 (Kloeden and Platen 1992, section 10.2, from memory); in space a
smooth field is approximated as without noise.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from aleafield.arrays import FloatArray
from aleafield.ensemble.level import Level
from aleafield.forward.field_model import FieldModel
from tests.convergence.rates import observed_orders
from tests.noise.known_fields import model_of, quantity

REALIZATIONS = 1024
"""The order between two levels has a standard error of at most sqrt(1 / REALIZATIONS) / log(2) = 0.045: a root mean
square of normal numbers is known to 1 / sqrt(2 REALIZATIONS) of itself, where all points are taken for one."""
POINTS = {"left": -0.61, "middle": 0.13, "right": 0.4}
SCHEMES = [
    ("ring", "fourier", "collocation"),
    ("ring", "piecewise linear", "galerkin"),
    ("interval", "piecewise linear", "collocation"),
    ("interval", "chebyshev", "collocation"),
    ("interval", "legendre", "galerkin"),
]
DOMAINS = {"ring": 'shape = "ring"\nlength = 2.0', "interval": 'shape = "interval"\nfrom = -1.0\nto = 1.0'}
NODES = {"fourier": 16, "piecewise linear": 32, "chebyshev": 16, "legendre": 12}


def nonlinear(domain: str, projector: str, method: str, nodes: int, step: float) -> FieldModel:
    """A sigmoid field driven away from rest, noise of a size of a third of it; values at three points."""
    return model_of(
        f"""
title = "Nonlinear field"
seed = 41
[domain]
{DOMAINS[domain]}
[kernel]
form = "gaussian"
strength = 1.5
width = 0.5
[rate]
form = "logistic"
gain = 4.0
threshold = 0.4
[initial]
formula = "0.5 + 0.4*cos(pi*x)"
[dynamics]
time_constant = 1.0
duration = 1.0
[noise]
strength = 0.3
correlation = "gaussian"
correlation_length = 0.6
[scheme]
projector = "{projector}"
method = "{method}"
nodes = {nodes}
time_step = {step}
"""
        + "".join(quantity(name, "value", f"at = {x}") for name, x in POINTS.items())
    )


def values(model: FieldModel, level: Level, realizations: int) -> FloatArray:
    """Values (S, points) at the end."""
    records = model.evaluate(level, np.arange(realizations))
    assert records.valid.all()
    return np.stack([records.values[name] for name in POINTS], axis=1)


def nodal(model: FieldModel, level: Level) -> FloatArray:
    """The field (S, nodes) at the end, at the nodes of the model's own level: those of finer meshes among them."""
    fields = model.evaluate(level, np.arange(64), [model.duration]).fields
    assert fields is not None
    shared = np.isin(np.round(model.points(level), 9), np.round(model.points(model.level), 9))
    assert shared.sum() == model.level.nodes
    return fields[:, -1, shared]


def root_mean_squares(found: list[FloatArray]) -> list[float]:
    """Of the differences between neighbours, over realizations and points."""
    return [float(np.sqrt(np.mean((coarse - fine) ** 2))) for coarse, fine in pairwise(found)]


@pytest.mark.parametrize(("domain", "projector", "method"), SCHEMES)
def test_strong_order_one(domain: str, projector: str, method: str) -> None:
    """Errors e(h) - e(h/2) of steps 1/16 to 1/128 halve each time."""
    model = nonlinear(domain, projector, method, NODES[projector], 1 / 32)
    found = [values(model, replace(model.level, halvings=h), REALIZATIONS) for h in (-1, 0, 1, 2)]
    for order in observed_orders(root_mean_squares(found), [1 / 16, 1 / 32, 1 / 64]):
        assert 0.9 < order < 1.1


def meshes(model: FieldModel, count: int) -> list[Level]:
    """The model's level and finer ones; all with its modes, so that they see one noise."""
    levels = [model.level]
    while len(levels) < count:
        nodes, points = model.pairing.refined(levels[-1].nodes, levels[-1].quadrature_points)
        levels.append(replace(levels[-1], nodes=nodes, quadrature_points=points))
    return levels


@pytest.mark.parametrize(("domain", "method"), [("ring", "galerkin"), ("interval", "collocation")])
def test_space_parts_of_order_two(domain: str, method: str) -> None:
    """Piecewise linear: errors e(h) - e(h/2) fall by four.

    By collocation on a ring they are nothing at the nodes: there the rule is the periodic trapezoid.
    """
    model = nonlinear(domain, "piecewise linear", method, 33 if domain == "interval" else 32, 1 / 16)
    found = [nodal(model, level) for level in meshes(model, 4)]
    orders = observed_orders(root_mean_squares(found), [1 / 32, 1 / 64, 1 / 128])
    assert orders[-1] == pytest.approx(2.0, abs=0.05)


@pytest.mark.parametrize(
    ("domain", "projector", "method", "nodes"),
    [
        ("ring", "fourier", "collocation", 12),
        ("interval", "chebyshev", "collocation", 9),
        ("interval", "legendre", "galerkin", 8),
    ],
)
def test_space_parts_faster_than_any_power(domain: str, projector: str, method: str, nodes: int) -> None:
    """The field is analytic in x, noise and all: doubling the nodes squares the error, or nearly."""
    model = nonlinear(domain, projector, method, nodes, 1 / 16)
    coarse, fine = root_mean_squares([values(model, level, 64) for level in meshes(model, 3)])
    assert fine < coarse**1.5
