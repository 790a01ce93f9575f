"""How honest and how precise indices of sensitivity are.

``python -m tests.benchmarks.sensitivity [designs [function ...]]``

Coverage at a stated 95 % of first-order indices from a sample, and of first and total ones by exchange, for every
index of six functions with known indices; 16 scramblings, jackknife over them and over 8 pairs of them.  Shapley
effects of three and eight correlated lognormal factors, by the function itself: named Shapley.  Each design has its
own seed, none of them used in the tests.
"""

from __future__ import annotations

import sys

import numpy as np

from aleafield.sensitivity.shapley import shapley_effects
from tests.sensitivity.coverage import count_hits
from tests.sensitivity.known_functions import FUNCTIONS, scrambled
from tests.sensitivity.test_shapley import EIGHT, SLOPES_8, THREE, by_definition, explained

POINTS = (16, 32, 64)
"""Points in each of 16 scramblings."""
JOINED = {1: "16 scramblings", 2: "8 pairs"}
SHAPLEY = (("three", np.array([0.2, -0.3, 0.25]), THREE, 256), ("eight", SLOPES_8, EIGHT, 256))


def indices(designs: int, names: list[str]) -> None:
    """Print the coverage of every index of the functions with these names."""
    for function in FUNCTIONS:
        if function.name not in names:
            continue
        for points in POINTS:
            for joined, name in JOINED.items():
                if joined == 2 and points != 32:
                    continue
                hits = count_hits(function, points, designs, 1_000_000, blocks_joined=joined)
                for kind, held in hits.items():
                    shares = " ".join(f"{share:.3f}" for share in held / designs)
                    print(f"{function.name:9} {16 * points:5} rows, {name:14} {kind:16} {shares}", flush=True)


def shapley(designs: int) -> None:
    """Print rms error and coverage of Shapley effects."""
    for name, slopes, latent, points in SHAPLEY:
        d = len(slopes)
        truth = by_definition(d, lambda u, b=slopes, c=latent: float(np.expm1(explained(b, c, u))))  # type: ignore[misc]
        errors, held = [], np.zeros(d)
        for design in range(designs):
            unit, block = scrambled(2 * d, points, 2_000_000 + design)
            found = shapley_effects(lambda z, b=slopes: np.exp(z @ b)[:, None], latent, unit, block, 16, 0.95)  # type: ignore[misc]
            errors.append(found.value[:, 0] - truth)
            held += (found.low[:, 0] <= truth + 1e-12) & (truth - 1e-12 <= found.high[:, 0])
        shares = " ".join(f"{share:.3f}" for share in held / designs)
        print(
            f"Shapley, {name}, {16 * points} rows: rms {np.sqrt(np.mean(np.square(errors))):.2g}, {shares}",
            flush=True,
        )


def main() -> None:
    """Print the tables."""
    designs = int(sys.argv[1]) if len(sys.argv) > 1 else 1000
    names = sys.argv[2:]
    indices(designs, names or [function.name for function in FUNCTIONS])
    if not names or "Shapley" in names:
        shapley(max(designs // 10, 1))


if __name__ == "__main__":
    main()
