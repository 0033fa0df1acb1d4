"""The fleets of known truth must themselves be right: before a forecast is judged by them, they are judged here."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import ndtr, ndtri
from scipy.stats import binomtest, kstest

from electrolog.fouling.events import EXPOSURE, READING, RENEWAL
from tests.fouling.fleets import baselines
from tests.fouling.fleets.families import FAMILIES, generator
from tests.fouling.fleets.generator import Gaussian, Shape
from tests.fouling.fleets.oracle import oracle
from tests.fouling.fleets.scoring import score
from tests.fouling.fleets.simulate import draw, fleet, walk

# one in a hundred for all families together: each is looked at four times (now and ahead, coverage and PIT)
ODDS_OF_A_FALSE_ALARM = 0.01 / (4 * len(FAMILIES))


def normal_draws(mean, sd, n=4000):
    return mean[:, None] + sd * ndtri((np.arange(n) + 0.5) / n)


class TestScores:
    def test_crps_and_log_score_of_a_normal_forecast_are_the_closed_forms(self):
        """Gneiting and Raftery (2007), J. Am. Stat. Assoc. 102, 359–378: the CRPS of a normal."""
        truth, sd = np.array([-1.0, 0.0, 0.4, 1.3]), 0.7
        z = truth / sd
        density = np.exp(-(z**2) / 2) / np.sqrt(2 * np.pi)
        closed = sd * (z * (2 * ndtr(z) - 1) + 2 * density - 1 / np.sqrt(np.pi))
        found = score(normal_draws(np.zeros(4), sd), truth)
        assert found.crps == pytest.approx(closed.mean(), rel=2e-4)
        assert found.log_score == pytest.approx(-np.log(density / sd).mean(), abs=0.03)
        assert found.pit == pytest.approx(ndtr(z), abs=1e-3)

    def test_crps_of_weighted_draws_is_its_definition(self):
        rng = np.random.default_rng(1)
        x, w, y = rng.normal(size=(1, 7)), rng.dirichlet(np.ones(7))[None], 0.3
        pairs = np.abs(x.T - x)
        by_definition = np.sum(w * np.abs(x - y)) - (w @ pairs @ w.T).item() / 2
        assert score(x, np.array([y]), w).crps == pytest.approx(by_definition, rel=1e-12)

    def test_weights_count_as_repeats(self):
        repeated = score(np.array([[1.0, 1.0, 1.0, 2.0]]), np.array([1.2]))
        weighted = score(np.array([[2.0, 1.0]]), np.array([1.2]), np.array([[0.25, 0.75]]))
        assert weighted.crps == pytest.approx(repeated.crps)
        assert weighted.pit == pytest.approx(repeated.pit)

    def test_too_narrow_a_forecast_holds_too_few_and_scores_worse(self):
        truth = np.random.default_rng(2).normal(size=2000)
        right, narrow = (score(normal_draws(np.zeros(2000), sd, 400), truth) for sd in (1.0, 0.5))
        assert right.coverage == pytest.approx((0.5, 0.8, 0.9), abs=0.03)
        assert narrow.coverage[2] < 0.65
        assert narrow.crps > right.crps
        assert narrow.log_score > right.log_score


@pytest.mark.parametrize("family", FAMILIES)
class TestEveryFamily:
    def test_a_seed_makes_one_fleet_and_another_seed_another(self, family):
        first, again, other = fleet(family, 3, 24), fleet(family, 3, 24), fleet(family, 4, 24)
        assert np.array_equal(first.events.amount, again.events.amount)
        assert np.array_equal(first.truth.log_sensitivity_ahead, again.truth.log_sensitivity_ahead)
        assert first.events.amount.tolist() != other.events.amount.tolist()

    def test_events_are_a_table_that_a_fit_can_read(self, family):
        events = fleet(family, 5, 60).events
        names = {EXPOSURE: events.settings, RENEWAL: events.renewals, READING: events.days}
        assert np.all(np.diff(events.unit) >= 0)
        assert all(events.which[events.kind == kind].max(initial=-1) < len(of) for kind, of in names.items())
        assert np.array_equal(np.unique(events.which[events.kind == READING]), np.arange(len(events.days)))
        assert np.all(np.isfinite(events.amount))
        assert np.all(np.isnan(events.se[events.kind != READING]))
        assert all(len(values) == len(events.units) for values in events.groups.values())
        for unit in range(len(events.units)):
            days = events.which[(events.unit == unit) & (events.kind == READING)]
            assert np.all(np.diff(days) >= 0), "a unit's readings go forward in time"

    def test_the_oracle_is_calibrated_and_its_draws_suffice(self, family):
        fleets = [fleet(family, seed, 200) for seed in range(2 if family != "young-lab" else 12)]
        pits = []
        for known in fleets:
            best, scored = oracle(known, n_draws=400), known.truth.scored
            assert np.nanmin(best.effective_draws[scored]) > 60
            for draws, truth in (
                (best.now, known.truth.log_sensitivity_now),
                (best.ahead, known.truth.log_sensitivity_ahead),
            ):
                pits.append(score(draws[scored], truth[scored], best.weights[scored]).pit)
        for at in (np.concatenate(pits[0::2]), np.concatenate(pits[1::2])):
            held = int(np.sum(np.abs(at - 0.5) <= 0.45))
            assert binomtest(held, at.size, 0.9).pvalue > ODDS_OF_A_FALSE_ALARM
            assert kstest(at, "uniform").pvalue > ODDS_OF_A_FALSE_ALARM


class TestTheOracle:
    def test_without_fouling_it_is_the_normal_posterior_of_a_mean(self):
        known = fleet("none", 1, 24)
        gen, best = known.truth.generator, oracle(known, n_draws=4000)
        reading = known.events.kind == READING
        for unit in range(3):
            at = reading & (known.events.unit == unit)
            y = known.events.amount[at] - known.truth.day_effect[known.events.which[at]]
            precision = 1 / known.truth.error_sd[at] ** 2
            total = precision.sum() + 1 / gen.level.sd**2
            mean = (precision @ y + gen.level.mean / gen.level.sd**2) / total
            drawn = best.now[unit]
            assert np.average(drawn, weights=best.weights[unit]) == pytest.approx(mean, abs=4e-4 + total**-0.5 / 15)
            assert np.std(drawn) == pytest.approx(total**-0.5, rel=0.05)

    def test_it_agrees_with_draws_from_the_generating_distribution_weighted_by_likelihood(self):
        """Brute force: a million probes from the cohort, each weighted by the likelihood of one unit's readings."""
        known = fleet("square-root", 2, 24)
        gen, events, state = known.truth.generator, known.events, walk(known.truth.generator, known.events)
        best, rng = oracle(known, n_draws=4000), np.random.default_rng(0)
        n = 1_000_000
        level = rng.normal(gen.level.mean, gen.level.sd, n)
        log_half_life = rng.normal(gen.log_half_life.mean, gen.log_half_life.sd, n)
        counts = np.bincount(events.unit[events.kind == READING])
        unit = int(np.argmin(counts))
        log_weight = np.zeros(n)
        for row in np.flatnonzero((events.unit == unit) & (events.kind == READING)):
            expected = level - gen.shape.loss(state.clock_h[row], log_half_life, np.zeros(n))
            y = events.amount[row] - known.truth.day_effect[events.which[row]]
            log_weight -= ((y - expected) / known.truth.error_sd[row]) ** 2 / 2
        weight = np.exp(log_weight - log_weight.max())
        end_h = state.clock_h[events.unit == unit][-1]
        brute = level - gen.shape.loss(end_h + 4.0, log_half_life, np.zeros(n))
        mean = np.average(brute, weights=weight)
        sd = np.sqrt(np.average((brute - mean) ** 2, weights=weight))
        draws, weights = best.ahead[unit], best.weights[unit]
        found = np.average(draws, weights=weights)
        assert found == pytest.approx(mean, abs=0.1 * sd)
        assert np.sqrt(np.average((draws - found) ** 2, weights=weights)) == pytest.approx(sd, rel=0.1)

    def test_nothing_simpler_beats_it(self):
        known = fleet("coatings", 0, 100)
        truth = known.truth.log_sensitivity_ahead
        best = oracle(known, n_draws=400)
        crps = score(best.ahead, truth, best.weights).crps
        for simpler in (baselines.last_value, baselines.mixed_model):
            assert score(simpler(known)[1], truth).crps > 1.2 * crps


class TestTheTraitOfAFamily:
    def test_a_renewal_winds_the_clock_back_and_a_cut_changes_the_area(self):
        known = fleet("cleanings", 0, 60)
        state, events = walk(known.truth.generator, known.events), known.events
        rows = np.flatnonzero(events.kind == RENEWAL)
        recovery = np.array([r.recovery for r in known.truth.generator.renewals])[events.which[rows]]
        assert state.clock_h[rows] == pytest.approx((1 - recovery) * state.clock_h[rows - 1])
        cut = rows[events.which[rows] == events.renewals.index("recut")]
        assert np.all(np.diff(state.log_area)[cut - 1] == pytest.approx(events.amount[cut]))

    def test_a_setting_fouls_by_its_weight(self):
        known = fleet("mixed-settings", 0, 60)
        state, events = walk(known.truth.generator, known.events), known.events
        hours = [
            np.sum(events.amount[(events.unit == 7) & (events.kind == EXPOSURE) & (events.which == s)])
            for s in range(3)
        ]
        assert state.clock_h[events.unit == 7][-1] == pytest.approx(
            np.dot(known.truth.generator.setting_weights, hours)
        )

    def test_slips_are_tenfold_and_seen_in_the_readings(self):
        known = fleet("slips", 0)
        slipped = known.truth.slip != 0
        assert 10 < slipped.sum() < 60
        assert np.exp(np.abs(known.truth.slip[slipped])) == pytest.approx(np.full(slipped.sum(), 10.0))

    def test_the_probes_that_break_are_the_ones_that_lost_most_and_end_unread(self):
        known = fleet("informative-loss", 0)
        units, events = known.truth.units, known.events
        last = np.searchsorted(events.unit, np.arange(len(events.units)), side="right") - 1
        assert units.log_half_life[units.broken].mean() < units.log_half_life[~units.broken].mean() - 0.2
        assert np.all(events.kind[last[units.broken]] == EXPOSURE)
        assert not np.any(known.truth.scored & units.broken)

    def test_a_young_lab_has_24_probes_read_once_or_twice(self):
        events = fleet("young-lab", 0).events
        counts = np.bincount(events.unit[events.kind == READING])
        assert len(events.units) == 24
        assert set(counts) == {1, 2}

    def test_readings_scatter_about_the_truth_as_the_generator_says(self):
        """No spread between probes, no fouling: what is left is the day and the reading's own error."""
        gen = replace(
            generator("none", 0, 300), level=Gaussian(2.0, 0.0), log_half_life=Gaussian(2.0, 0.0), day_sd=0.05
        )
        known = draw(gen, 0)
        reading = known.events.kind == READING
        left = known.events.amount[reading] - 2.0 - known.truth.day_effect[known.events.which[reading]]
        assert kstest(left / known.truth.error_sd[reading], "norm").pvalue > 1e-3
        assert np.std(known.truth.day_effect) == pytest.approx(0.05, rel=0.25)
        ratio = known.events.se[reading] / np.sqrt(known.truth.error_sd[reading] ** 2 - gen.repeat_sd**2)
        assert np.nanmean(ratio**2) == pytest.approx(1.0, rel=0.1)
        assert 0.05 < np.mean(np.isnan(ratio)) < 0.15


@pytest.mark.parametrize(
    ("shape", "left"),
    [
        (Shape("none"), 1.0),
        (Shape("exponential"), 0.5),
        (Shape("plateau", plateau=0.4), 0.7),
        (Shape("fast-then-slow", fast_share=0.4, fast_times=20), 0.3 + 0.4 * 2**-20),
        (Shape("square-root"), 0.5),
        (Shape("patch"), 0.5),
    ],
    ids=lambda value: value.name if isinstance(value, Shape) else "",
)
def test_after_one_half_life_half_of_what_fouls_is_left(shape, left):
    loss = shape.loss(np.array([0.0, 10.0, 20.0]), np.log(10.0), np.log(1.5))
    assert loss[0] == pytest.approx(0.0, abs=1e-12)
    assert np.exp(-loss[1]) == pytest.approx(left)
    assert np.all(np.diff(loss) >= 0)
