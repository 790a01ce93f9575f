"""What the chaos layer promises, measured: ``python -m tests.benchmarks.chaos``

Times of fits; one scrambled sequence against 16 scramblings of a sixteenth of its length; coverage of the
intervals of indices and of a surrogate's statistics at a stated 95 %; how often a smooth field is accepted and a
bistable one refused.
"""

from __future__ import annotations

import time
from collections.abc import Callable

import numpy as np
from scipy.stats.qmc import Sobol

from aleafield.arrays import FloatArray
from aleafield.chaos.acceptance import judge
from aleafield.chaos.basis import Basis
from aleafield.chaos.expansion import Expansion
from aleafield.chaos.germs import choose_germs
from aleafield.chaos.indices import share_intervals
from aleafield.chaos.multi_index import total_degree
from aleafield.chaos.regression import fit
from aleafield.chaos.search import search
from aleafield.chaos.surrogate import Surrogate
from aleafield.randomness.laws import Law, Uniform
from tests.chaos.ring_fields import BISTABLE, SMOOTH, centre_value, laws
from tests.sensitivity.known_functions import FRONT, G4, ISHIGAMI, KnownFunction, scrambled

HELD_OUT = 64
Response = Callable[[FloatArray], FloatArray]


def one_sequence(d: int, runs: int, seed: int) -> FloatArray:
    """The first points of one scrambled Sobol' sequence, (runs, d)."""
    points: FloatArray = Sobol(2 * d, rng=np.random.default_rng([7, seed])).random(runs)[:, :d] + 2.0**-33
    return points


def sixteen(d: int, runs: int, seed: int) -> FloatArray:
    """The main sample's points: 16 scramblings, (runs, d)."""
    return scrambled(2 * d, runs // 16, seed)[0][:, :d]


def held_out(d: int, seed: int, runs: int = HELD_OUT) -> FloatArray:
    """Plain random points, (runs, d)."""
    return np.random.default_rng([8, seed]).random((runs, d))


def uniform(d: int) -> list[Law]:
    """Laws on the unit interval."""
    return [Uniform(0.0, 1.0)] * d


def times() -> None:
    """Seconds of one fit of 1,000 outputs."""
    for d, p in ((6, 4), (12, 3), (9, 2)):
        basis = Basis(choose_germs(uniform(d)), total_degree(d, p))
        u = np.random.default_rng(1).random((2 * len(basis), d))
        y = np.random.default_rng(2).normal(size=(len(u), 1000))
        values = basis.evaluate(u)
        fit(values, y)
        start = time.perf_counter()
        fit(basis.evaluate(u), y)
        print(
            f"fit, {d} inputs, degree {p}, {len(basis)} terms: {time.perf_counter() - start:.3f} s",
            flush=True,
        )


def designs(truth: KnownFunction, runs: int, repetitions: int) -> None:
    """Medians over designs of the true relative error, by both designs, and rms errors of indices."""
    far = held_out(truth.inputs, -1 % 2**32, 20000)
    exact = truth.evaluate(far)
    for name, points in (("one sequence", one_sequence), ("16 scramblings", sixteen)):
        errors, ratios, misses, bounded = [], [], [], []
        for seed in range(repetitions):
            u = points(truth.inputs, runs, seed)
            y, h = truth.evaluate(u)[:, None], held_out(truth.inputs, seed, 32)
            found = search(u, y, uniform(truth.inputs))
            bound = judge(found, u, y, h, truth.evaluate(h)[:, None])[0].error
            error = float(np.mean((exact - found.evaluate(far)[:, 0]) ** 2)) / truth.variance
            errors.append(error)
            bounded.append(bound / error)
            ratios.append(float(found.loo[0]) / error)
            misses.append(
                np.concatenate((found.first()[:, 0] - truth.first, found.total()[:, 0] - truth.total))
            )
        rms = float(np.sqrt(np.mean(np.square(misses))))
        print(
            f"{truth.name}, {runs} runs, {name}: error {np.median(errors):.1e}, leave-one-out over it "
            f"{np.median(ratios):.2f} (least {np.min(ratios):.2f}), bound over it {np.median(bounded):.1f}, "
            f"holds {np.mean(np.array(bounded) >= 1):.2f}; rms error of indices {rms:.1e}",
            flush=True,
        )


def index_coverage(
    name: str, response: Response, of: list[Law], truth: FloatArray, runs: int, repetitions: int
) -> None:
    """Share of intervals of first and total indices that hold the truth (2 d,), least and mean over indices."""
    hits, widths, accepted = [], [], 0
    for seed in range(repetitions):
        u = sixteen(len(of), runs, seed)
        h = held_out(len(of), seed)
        y = response(u)[:, None]
        found = search(u, y, of)
        verdict = judge(found, u, y, h, response(h)[:, None])[0]
        if not verdict.accepted:
            continue
        accepted += 1
        terms = np.concatenate((found.first_terms(), found.total_terms()))
        shares = share_intervals(found, terms, np.array([verdict.error]), 0.95)
        hits.append((shares.low[:, 0] <= truth) & (truth <= shares.high[:, 0]))
        widths.append(shares.high[:, 0] - shares.low[:, 0])
    if accepted:
        each = np.mean(hits, axis=0)
        print(
            f"indices, {name}, {runs} runs: {accepted} of {repetitions} accepted; coverage least "
            f"{each.min():.3f}, mean {each.mean():.3f}; median width {np.median(widths):.1e}",
            flush=True,
        )
    else:
        print(f"indices, {name}, {runs} runs: none of {repetitions} accepted", flush=True)


def statistic_coverage(name: str, response: Response, of: list[Law], runs: int, repetitions: int) -> None:
    """Share of intervals of mean, corrected mean, sd, quantiles and a probability that hold the truth.

    Half-widths are those of the surrogate and of the points at which it was evaluated, added.
    """
    d = len(of)
    exact = response(one_sequence(d, 1 << 20, 99))
    levels = np.quantile(exact, [0.05, 0.5, 0.95])
    truth = np.array([exact.mean(), exact.mean(), exact.std(), *levels, (exact > levels[2]).mean()])
    hits, halves = [], []
    for seed in range(repetitions):
        u, h = sixteen(d, runs, seed), held_out(d, seed)
        y, y_held = response(u)[:, None], response(h)
        found = search(u, y, of)
        verdict = judge(found, u, y, h, y_held[:, None])[0]
        if not verdict.accepted:
            continue
        one = Surrogate(found, 0, h, y_held, seed)
        stated = [
            one.mean(0.95),
            one.corrected_mean(0.95),
            one.sd(0.95),
            *(one.quantile(p, 0.95) for p in (0.05, 0.5, 0.95)),
            one.exceedance(float(levels[2]), 0.95),
        ]
        values = np.array([s.estimate.value for s in stated], dtype=np.float64)
        ends = np.array([(s.estimate.low, s.estimate.high) for s in stated], dtype=np.float64)
        half = np.array([s.surrogate for s in stated]) + 0.5 * (ends[:, 1] - ends[:, 0])
        hits.append(np.abs(values - truth) <= half)
        halves.append(half / np.maximum(np.abs(values - truth), 1e-300))
    if hits:
        shares = ", ".join(f"{share:.2f}" for share in np.mean(hits, axis=0))
        ratios = ", ".join(f"{ratio:.1f}" for ratio in np.median(halves, axis=0))
        print(
            f"statistics, {name}, {runs} runs, {len(hits)} of {repetitions} accepted: mean, corrected mean, sd, "
            f"quantiles .05 .5 .95, P: coverage {shares}; half-width over error {ratios}",
            flush=True,
        )


def acceptance(repetitions: int = 400, runs: int = 64, held: int = 32) -> None:
    """Shares of designs on which a smooth field is accepted and a bistable one refused."""
    for name, equation in (("smooth", SMOOTH), ("bistable", BISTABLE)):
        of = laws(equation)
        u = np.concatenate([sixteen(len(of), runs, seed) for seed in range(repetitions)])
        h = np.concatenate([held_out(len(of), seed, held) for seed in range(repetitions)])
        y, y_held = centre_value(equation, u), centre_value(equation, h)
        accepted, reasons = 0, dict[str, int]()
        for seed in range(repetitions):
            fitted, kept = slice(seed * runs, (seed + 1) * runs), slice(seed * held, (seed + 1) * held)
            found = search(u[fitted], y[fitted, None], of)
            verdict = judge(found, u[fitted], y[fitted, None], h[kept], y_held[kept, None])[0]
            accepted += verdict.accepted
            reason = verdict.reason.split(":")[0]
            reasons[reason] = reasons.get(reason, 0) + 1
        print(
            f"{name} ring field, {runs} + {held} runs: {accepted} of {repetitions} accepted; {reasons}",
            flush=True,
        )


def ring_reference() -> tuple[list[Law], Response, Expansion]:
    """The smooth ring field and an expansion of it from 3584 runs, whose indices are right to 5e-5."""
    of = list(laws(SMOOTH))
    u = one_sequence(len(of), 4096, 1)[:3584]
    return of, lambda points: centre_value(SMOOTH, points), search(u, centre_value(SMOOTH, u)[:, None], of)


def main() -> None:
    """Print all."""
    times()
    for truth, runs in ((FRONT, 64), (FRONT, 256), (ISHIGAMI, 256), (ISHIGAMI, 512), (G4, 256), (G4, 512)):
        designs(truth, runs, 60)
    for truth, runs in ((FRONT, 32), (FRONT, 64), (ISHIGAMI, 256), (ISHIGAMI, 512), (G4, 512)):
        exact = np.concatenate((truth.first, truth.total))
        index_coverage(truth.name, truth.evaluate, uniform(truth.inputs), exact, runs, 200)
    for truth, runs in ((FRONT, 32), (FRONT, 64), (ISHIGAMI, 256), (G4, 512)):
        statistic_coverage(truth.name, truth.evaluate, uniform(truth.inputs), runs, 100)
    of, response, reference = ring_reference()
    exact = np.concatenate((reference.first()[:, 0], reference.total()[:, 0]))
    for runs in (64, 128, 256):
        index_coverage("ring field", response, of, exact, runs, 60)
    acceptance()


if __name__ == "__main__":
    main()
