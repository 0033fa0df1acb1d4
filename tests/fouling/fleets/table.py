"""The table of families: each forecast at +4 h in vivo beside the best possible, and what its intervals hold.

    python -m tests.fouling.fleets.table [--families slips bad-days] [--first-seed 100] [--seeds 2] [--units 300]
        [--now]

A ratio is the mean CRPS (of log sensitivity) over the oracle's, all seeds pooled; coverage counts the truths
in the central 50, 80 and 90 % intervals; the log score is what is lost to the oracle, a unit. Told: the same forecast
that needn't learn the shape and the hyper-parameters, so that no fit of the same readings could be expected to do
better.
"""

from __future__ import annotations

import argparse
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from tests.fouling.fleets import baselines, ours
from tests.fouling.fleets.families import FAMILIES
from tests.fouling.fleets.oracle import oracle
from tests.fouling.fleets.scoring import Score, score
from tests.fouling.fleets.simulate import Fleet, fleet

YOUNG_LABS_PER_SEED = 12  # each has 24 probes only


@dataclass(frozen=True)
class Scores:
    """Of one fleet; `told` is None where the truth is none of the shapes."""

    oracle: Score
    last_value: Score
    mixed_model: Score
    ours: Score
    told: Score | None  # the same, told the true shape and hyper-parameters
    true_shape_weight: float
    seconds: float


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--families", nargs="+", choices=FAMILIES, default=FAMILIES, metavar="FAMILY")
    parser.add_argument("--first-seed", type=int, default=0, help="of the 300-probe families, and of the young labs")
    parser.add_argument("--seeds", type=int, default=1)
    parser.add_argument("--units", type=int, default=300)
    parser.add_argument("--now", action="store_true", help="score the sensitivity at the end of the events instead")
    asked = parser.parse_args()
    print(HEAD)
    for family in asked.families:
        fleets = fleets_of(family, asked.first_seed, asked.seeds, asked.units)
        print(row(family, [scores(each, now=asked.now) for each in fleets]), flush=True)


def fleets_of(family: str, first_seed: int, n_seeds: int, n_units: int) -> Iterable[Fleet]:
    each = YOUNG_LABS_PER_SEED if family == "young-lab" else 1
    return (fleet(family, seed, n_units) for seed in range(first_seed, first_seed + n_seeds * each))


def scores(known: Fleet, *, now: bool = False) -> Scores:
    scored, truth = known.truth.scored, known.truth
    target = (truth.log_sensitivity_now if now else truth.log_sensitivity_ahead)[scored]
    best = oracle(known)
    found, told = ours.answer(known), ours.answer_told(known)
    which = 0 if now else 1
    return Scores(
        oracle=score((best.now, best.ahead)[which][scored], target, best.weights[scored]),
        last_value=score(baselines.last_value(known)[which][scored], target),
        mixed_model=score(baselines.mixed_model(known)[which][scored], target),
        ours=score((found.now, found.ahead)[which][scored], target),
        told=score((told.now, told.ahead)[which][scored], target) if told else None,
        true_shape_weight=found.true_shape_weight,
        seconds=found.seconds,
    )


HEAD = (
    f"{'':16} {'oracle':>21}  {'last value':>14}  {'mixed model':>14}  {'told':>5}  {'ours':>38} {'shape':>6} {'':>7}\n"
    f"{'family':16} {'CRPS':>6} {'50':>4} {'80':>4} {'90':>4}  {'ratio':>5} {'90':>8}  {'ratio':>5} {'90':>8}"
    f"  {'ratio':>5}  {'ratio':>5} {'log score':>16} {'50':>5} {'80':>4} {'90':>4} {'weight':>6} {'seconds':>7}"
)


def row(family: str, found: Sequence[Scores]) -> str:
    best = [s.oracle for s in found]
    base = mean_crps(best)
    simple = [
        f"{mean_crps(each) / base:5.2f} {coverage(each)[2]:8.0%}"
        for each in ([s.last_value for s in found], [s.mixed_model for s in found])
    ]
    of_oracle = f"{base:6.4f} " + " ".join(f"{c:4.0%}" for c in coverage(best))
    return f"{family:16} {of_oracle}  {simple[0]}  {simple[1]}  {_our_part(found, base, best)}"


def _our_part(found: Sequence[Scores], base: float, best: Sequence[Score]) -> str:
    mine, told = [s.ours for s in found], [s.told for s in found if s.told]
    lost = _pooled([s.log_score for s in mine], mine) - _pooled([s.log_score for s in best], best)
    held = " ".join(f"{c:4.0%}" for c in coverage(mine))
    weight = np.mean([s.true_shape_weight for s in found])
    seconds = np.mean([s.seconds for s in found])
    bound = f"{mean_crps(told) / base:5.2f}" if told else "    –"
    return f"{bound}  {mean_crps(mine) / base:5.2f} {lost:+10.2f} nats  {held} {weight:6.2f} {seconds:7.1f}"


def mean_crps(found: Sequence[Score]) -> float:
    return _pooled([s.crps for s in found], found)


def coverage(found: Sequence[Score]) -> tuple[float, ...]:
    return tuple(_pooled(list(at_level), found) for at_level in zip(*(s.coverage for s in found), strict=True))


def _pooled(values: Sequence[float], found: Sequence[Score]) -> float:
    return float(np.average(values, weights=[s.n for s in found]))


if __name__ == "__main__":
    main()
