"""How often the interval of the sd holds the truth for skew laws: ``python -m tests.benchmarks.skewness``

exp(s z), z standard normal, plain Monte Carlo at a stated 95 %; and sums of two lognormals' logarithms under
16 scramblings.  The truth is the sd of the lognormal law.
"""

from __future__ import annotations

import numpy as np
from scipy import stats

from aleafield.estimates import Sample, estimate_sd

REPETITIONS = {"plain": 2000, "scrambled": 300}
SAMPLES = {"plain": (64, 256, 1024), "scrambled": (128, 512, 2048)}


def lognormal_sd(sigma: float) -> float:
    """Standard deviation of exp(sigma z)."""
    return float(np.sqrt(np.expm1(sigma**2) * np.exp(sigma**2)))


def holds(sample: Sample, truth: float) -> bool:
    """Whether the stated interval contains the truth."""
    found = estimate_sd(sample, 0.95)
    return found.low is not None and found.high is not None and found.low <= truth <= found.high


def plain(sigma: float, samples: int, rng: np.random.Generator) -> bool:
    """One sample of independent values."""
    return holds(Sample.of(np.exp(sigma * rng.normal(size=samples))), lognormal_sd(sigma))


def scrambled(sigma: float, samples: int, rng: np.random.Generator) -> bool:
    """One sample of 16 scramblings in two dimensions, of equal weight in the logarithm."""
    points = [stats.qmc.Sobol(2, scramble=True, rng=rng).random(samples // 16) for _ in range(16)]
    z = stats.norm.ppf(np.clip(np.stack(points, axis=1), 1e-12, 1 - 1e-12)).sum(axis=-1) / np.sqrt(2)
    replicate = np.arange(samples) % 16
    return holds(
        Sample.of(np.exp(sigma * z).ravel(), replicate=replicate, replicates=16), lognormal_sd(sigma)
    )


def main() -> None:
    """Print the table."""
    for name, trial, sigmas in (("plain", plain, (0.5, 1.0)), ("scrambled", scrambled, (0.3, 0.5))):
        for sigma in sigmas:
            shares = []
            for samples in SAMPLES[name]:
                rng = np.random.default_rng([17, samples])
                hits = [trial(sigma, samples, rng) for _ in range(REPETITIONS[name])]
                shares.append(f"{samples}: {np.mean(hits):.3f}")
            print(
                f"{name}, exp({sigma:g} z), {REPETITIONS[name]} repetitions: {', '.join(shares)}", flush=True
            )


if __name__ == "__main__":
    main()
