"""The kernel applied to a batch of sources, in several ways, chosen by counted operations."""

from __future__ import annotations

from aleafield.operators.choice import KernelUse, OperatorChoice, choose_operator, cosine_orders
from aleafield.operators.dense import SampleDenseOperator, SharedDenseOperator
from aleafield.operators.lattice import CirculantOperator, LatticePair, ToeplitzOperator
from aleafield.operators.operator import KernelOperator
from aleafield.operators.symbol import SymbolOperator

__all__ = [
    "CirculantOperator",
    "KernelOperator",
    "KernelUse",
    "LatticePair",
    "OperatorChoice",
    "SampleDenseOperator",
    "SharedDenseOperator",
    "SymbolOperator",
    "ToeplitzOperator",
    "choose_operator",
    "cosine_orders",
]
