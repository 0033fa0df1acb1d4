"""What a cohort's fit says of labs whose truth is known, and what it says when it can't know."""

from __future__ import annotations

import json
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from electrolog.errors import DataError
from electrolog.fouling import cohort, shared
from electrolog.fouling.ascend import THOROUGH
from electrolog.fouling.cohort import fit_cohort
from electrolog.fouling.events import EXPOSURE, READING, RENEWAL, Events
from electrolog.fouling.fit import CohortFit
from electrolog.fouling.forecast import posterior
from electrolog.fouling.subset import take_units
from tests.fouling.fleets.scoring import score
from tests.fouling.fleets.simulate import AHEAD_H, Fleet, fleet

YOUNG_LABS = range(200, 212)


def ahead(events: Events, hours: float = AHEAD_H) -> np.ndarray:
    extra = np.zeros((len(events.units), len(events.settings)))
    extra[:, events.settings.index("in-vivo")] = hours
    return extra


def one_unit(kind: list[int], amount: list[float], **changed) -> Events:
    n = len(kind)
    events = Events(
        unit=np.zeros(n, dtype=np.int64),
        kind=np.array(kind, dtype=np.int8),
        which=np.zeros(n, dtype=np.int64),
        amount=np.array(amount),
        se=np.full(n, np.nan),
        units=("P1",),
        settings=("in-vivo",),
        renewals=("clean:solvent",),
        days=("2030-01-01",),
        groups={"coating": ("PFSA",)},
    )
    return replace(events, **changed)


@pytest.fixture(scope="module")
def lab() -> Fleet:
    return fleet("cleanings", 3, 120)


@pytest.fixture(scope="module")
def fit(lab: Fleet) -> CohortFit:
    return fit_cohort(lab.events)


class TestKnownTruth:
    @pytest.mark.parametrize("family", ["plateau", "patch-per-probe", "bad-days"])
    def test_the_right_shape_wins_and_intervals_hold(self, family):
        known = fleet(family, 7, 200)
        fit = fit_cohort(known.events)
        assert fit.converged
        assert fit.shape_weights[known.truth.generator.shape.name] > 0.8
        scored = known.truth.scored
        draws = posterior(fit, known.events).log_sensitivity(ahead(known.events))[scored]
        held = score(draws, known.truth.log_sensitivity_ahead[scored]).coverage
        assert 0.835 <= held[2] <= 0.965  # 200 probes: three standard errors about 90 %
        assert 0.39 <= held[0] <= 0.61

    def test_recovery_of_each_method_is_learned(self, lab, fit):
        for row, renewal in zip(fit.summary["renewals"], lab.truth.generator.renewals, strict=True):
            assert row["method"] == renewal.name
            assert row["low"] - 0.05 < renewal.recovery < row["high"] + 0.05
            assert row["n_renewals"] > 50

    def test_settings_weights_are_learned_beside_in_vivo(self):
        known = fleet("mixed-settings", 2)
        rows = fit_cohort(known.events, shapes=("exponential", known.truth.generator.shape.name)).summary["settings"]
        for row, truth in zip(rows, known.truth.generator.setting_weights, strict=True):
            assert row["low"] * 0.9 <= truth <= row["high"] * 1.1

    def test_a_bad_day_is_named_and_is_no_fouling(self):
        known = fleet("bad-days", 4)
        rows = {row["day"]: row for row in fit_cohort(known.events, shapes=("exponential",)).summary["days"]}
        far = [k for k, effect in enumerate(known.truth.day_effect) if abs(effect) > 0.4]
        assert far
        for k in far:
            row = rows[known.events.days[k]]
            assert row["suspicious"]
            assert row["effect"] == pytest.approx(known.truth.day_effect[k], abs=0.15)

    def test_a_slip_is_flagged_and_hardly_moves_the_forecast(self):
        known = fleet("exponential", 5, 120)
        read = np.flatnonzero(known.events.kind == READING)
        counts = np.bincount(known.events.unit[read])
        unit = int(counts.argmax())
        row = read[known.events.unit[read] == unit][2]
        amount = known.events.amount.copy()
        amount[row] += np.log(10.0)
        slipped = replace(known.events, amount=amount)
        fit = fit_cohort(slipped, shapes=("exponential",))
        assert {"unit": known.events.units[unit], "reading": 2} in [
            {key: one[key] for key in ("unit", "reading")} for one in fit.summary["slips"]
        ]
        before = posterior(fit_cohort(known.events, shapes=("exponential",)), known.events)
        after = posterior(fit, slipped)
        moved = [d.log_sensitivity(ahead(known.events))[unit].mean() for d in (before, after)]
        assert moved[1] == pytest.approx(moved[0], abs=0.06)

    def test_sudden_damage_is_told_from_fouling(self):
        known = fleet("sudden-damage", 0)
        found = {row["unit"] for row in fit_cohort(known.events, shapes=("exponential",)).summary["damaged"]}
        hurt = {known.events.units[u] for u in np.flatnonzero(known.truth.units.damaged_at_run)}
        assert len(found & hurt) >= 4
        assert len(found - hurt) <= 3


class TestParts:
    @pytest.mark.parametrize(("hoped_for", "begun"), [(-1e4, 1), (1e4, 2)])
    def test_where_more_units_end_worse_than_a_part_they_are_begun_anew(self, lab, monkeypatch, hoped_for, begun):
        ((problem, peak, _),) = cohort.fit_each(lab.events, ("exponential",), rough=True)
        climb, tops = cohort.climb, []

        def watched(*told, **more):
            tops.append(climb(*told, **more))
            return tops[-1]

        monkeypatch.setattr(cohort, "climb", watched)
        part = replace(peak, log_posterior=peak.log_posterior + hoped_for)
        _, top, _ = cohort.fit_on(lab.events, problem, part, THOROUGH)
        assert len(tops) == begun
        assert top.log_posterior == max(one.log_posterior for one in tops)

    def test_a_shape_far_behind_in_the_part_has_no_weight_and_the_others_are_fitted_to_all(self, monkeypatch):
        monkeypatch.setattr(cohort, "SMALL", 100)
        monkeypatch.setattr(cohort, "PART", 60)
        known = fleet("exponential", 3, 160)
        fit = fit_cohort(known.events)
        assert fit.n_units == 160
        assert fit.shape_weights["none"] == 0.0
        assert fit.shape_weights["exponential"] > 0.5
        assert fit.converged


class TestKeptFit:
    def test_a_fit_read_back_gives_the_same_draws(self, lab, fit):
        back = CohortFit.from_dict(json.loads(json.dumps(fit.to_dict())))
        drawn = [posterior(one, lab.events).log_sensitivity(ahead(lab.events)) for one in (fit, back)]
        np.testing.assert_array_equal(*drawn)
        assert back.summary == fit.summary
        assert back.fingerprint == fit.fingerprint

    def test_a_unit_is_forecast_alike_whatever_else_is_read_back(self, lab, fit):
        kept = fit.to_dict()
        label = lab.events.units[17]
        alone = CohortFit.from_dict({"shared": kept["shared"], "units": {label: kept["units"][label]}})
        own = take_units(lab.events, np.array([17]))
        drawn = [posterior(one, own).log_sensitivity(ahead(own)) for one in (fit, alone)]
        np.testing.assert_array_equal(*drawn)

    def test_a_fit_by_another_method_is_refused(self, fit):
        with pytest.raises(DataError, match="cohort-0"):
            CohortFit.from_dict({"shared": fit.to_dict()["shared"] | {"method": "cohort-0"}, "units": {}})

    @pytest.mark.parametrize("missing", ["components", "line_error", "summary"])
    def test_a_fit_of_another_layout_is_refused(self, fit, missing):
        kept = fit.to_dict()
        del kept["shared"][missing]
        with pytest.raises(DataError, match=missing):
            CohortFit.from_dict(kept)

    def test_a_component_of_another_layout_is_refused(self, fit):
        kept = fit.to_dict()
        del kept["shared"]["components"][0]["mean_draws"]
        with pytest.raises(DataError, match="mean_draws"):
            CohortFit.from_dict(kept)

    def test_fitting_again_gives_the_same_numbers(self):
        known = fleet("young-lab", 2)
        first, second = (fit_cohort(known.events).to_dict() for _ in range(2))
        assert first == second

    def test_a_units_draws_are_the_same_whoever_else_is_asked_about(self, lab, fit):
        """Its own readings were in the fit: they count once, whichever way it is asked."""
        among = posterior(fit, lab.events).log_sensitivity(ahead(lab.events))
        for units in ([0], [17], [80], [17, 80]):
            asked = take_units(lab.events, np.array(units))
            draws = posterior(fit, asked).log_sensitivity(ahead(asked))
            np.testing.assert_allclose(draws, among[units], rtol=0, atol=1e-4)

    def test_in_a_young_cohort_too(self):
        known = fleet("young-lab", 3)
        fit = fit_cohort(known.events)
        among = posterior(fit, known.events).log_sensitivity(ahead(known.events))
        for unit in (5, 20):
            alone = take_units(known.events, np.array([unit]))
            draws = posterior(fit, alone).log_sensitivity(ahead(alone))[0]
            np.testing.assert_allclose(draws, among[unit], rtol=0, atol=2e-4)

    def test_a_new_reading_on_a_new_day_moves_and_narrows_the_forecast(self, lab, fit):
        known = take_units(lab.events, np.array([9]))
        older = posterior(fit, known)
        now = older.log_sensitivity(ahead(known, 0.0))[0]
        read = replace(
            known,
            unit=np.append(known.unit, 0),
            kind=np.append(known.kind, READING).astype(np.int8),
            which=np.append(known.which, len(known.days)),
            amount=np.append(known.amount, now.mean() + 0.15),
            se=np.append(known.se, 0.02),
            days=(*known.days, "a day that the fit never saw"),
        )
        newer = posterior(fit, read).log_sensitivity(ahead(known, 0.0))[0]
        assert now.mean() < newer.mean() < now.mean() + 0.15
        assert newer.std() < now.std()

    def test_names_that_the_fit_never_saw_widen_the_forecast(self, lab, fit):
        known = take_units(lab.events, np.array([9]))
        strange = replace(
            known, units=("new",), groups={"coating": ("another",), "batch": ("another",)}, kind=known.kind[:0]
        )
        nothing = replace(strange, unit=known.unit[:0], which=known.which[:0], amount=known.amount[:0], se=known.se[:0])
        draws = posterior(fit, nothing).log_sensitivity(np.zeros((1, 1)))[0]
        assert draws.std() > 0.3
        assert np.isfinite(draws).all()

    def test_fraction_left_is_of_the_reference_reading(self, lab, fit):
        drawn = posterior(fit, lab.events)
        first = np.zeros(len(lab.events.units), dtype=np.int64)
        left = drawn.log_fraction_left(ahead(lab.events), first)
        at_first = drawn.log_sensitivity_at_reading(first)
        np.testing.assert_allclose(left + at_first, drawn.log_sensitivity(ahead(lab.events)))

    def test_more_hours_never_bring_sensitivity_back(self, lab, fit):
        drawn = posterior(fit, lab.events)
        at = [drawn.log_sensitivity(ahead(lab.events, hours)) for hours in (0.0, 1.0, 4.0, 12.0)]
        assert all((later <= sooner).all() for sooner, later in pairwise(at))


class TestCannotTell:
    def test_no_calibration_at_all(self):
        fit = fit_cohort(one_unit([EXPOSURE], [2.0]))
        assert "no calibration yet" in fit.notes[0]
        assert posterior(fit, one_unit([EXPOSURE], [2.0])).log_sensitivity(np.zeros((1, 1)))[0].std() > 1.0

    def test_one_calibration(self):
        events = one_unit([READING], [2.0])
        fit = fit_cohort(events)
        assert any("nothing is known yet of how fast probes foul" in note for note in fit.notes)
        assert any("one day" in note for note in fit.notes)
        drawn = posterior(fit, events)
        now, later = (drawn.log_sensitivity(np.array([[hours]]))[0] for hours in (0.0, 4.0))
        assert now.mean() == pytest.approx(2.0, abs=0.1)
        assert np.quantile(later, 0.95) - np.quantile(later, 0.05) > 0.4

    def test_shapes_that_young_data_cannot_tell_are_said(self):
        fit = fit_cohort(fleet("young-lab", 0).events)
        assert any("can't tell between shapes" in note for note in fit.notes)
        assert len(fit.components) > 2

    def test_a_setting_seen_without_calibrations_is_said(self):
        kind, amount = [READING, EXPOSURE, READING], [2.0, 3.0, 1.8]
        events = one_unit(kind, amount, settings=("flow-cell",))
        assert any("no exposure was in-vivo" in note for note in fit_cohort(events).notes)

    def test_young_labs_intervals_hold(self):
        """24 probes with one or two calibrations each: the 90 % intervals are to hold 85 % of truths or more.

        The seeds were decided before any was looked at; they hold 93 %, single labs between 83 and 100 %, because a
        lab's probes share its errors.
        """
        inside = []
        for seed in YOUNG_LABS:
            known = fleet("young-lab", seed)
            draws = posterior(fit_cohort(known.events), known.events).log_sensitivity(ahead(known.events))
            low, high = np.quantile(draws, [0.05, 0.95], axis=1)
            truth, scored = known.truth.log_sensitivity_ahead, known.truth.scored
            inside += ((low <= truth) & (truth <= high))[scored].tolist()
        assert np.mean(inside) >= 0.85


class TestRefusals:
    def test_a_reading_that_is_no_number(self):
        with pytest.raises(DataError, match="no finite number"):
            fit_cohort(one_unit([READING, READING], [2.0, np.nan]))

    def test_events_out_of_order(self):
        events = one_unit([READING, READING], [2.0, 2.0], unit=np.array([1, 0]), units=("a", "b"), groups={})
        with pytest.raises(DataError, match="sorted"):
            fit_cohort(events)

    def test_a_negative_standard_error(self):
        with pytest.raises(DataError, match="negative"):
            fit_cohort(one_unit([READING], [2.0], se=np.array([-0.1])))

    def test_negative_hours(self):
        with pytest.raises(DataError, match="hours"):
            fit_cohort(one_unit([READING, EXPOSURE, READING], [2.0, -1.0, 2.0]))


def test_recut_changes_the_area_and_not_the_fouling():
    """Half of the area gone: half of the sensitivity, and nothing lost to fouling."""
    kind, amount = [READING, RENEWAL], [2.0, float(np.log(0.5))]
    events = one_unit(kind, amount, renewals=("recut",))
    drawn = posterior(fit_cohort(events), events)
    left = drawn.log_fraction_left(np.zeros((1, 1)), np.array([0]))[0]
    np.testing.assert_allclose(left, np.log(0.5))


def test_many_days_solved_thinly_agree_with_the_full_matrix(monkeypatch):
    known = fleet("exponential", 6)
    drawn = []
    for most_dense in (700, 10):
        monkeypatch.setattr(shared, "MOST_DENSE", most_dense)
        fit = fit_cohort(known.events, shapes=("exponential",))
        drawn.append(posterior(fit, known.events).log_sensitivity(ahead(known.events)))
    full, thin = drawn
    apart = np.abs(thin.mean(axis=1) - full.mean(axis=1))
    assert np.quantile(apart, 0.98) < 0.002
    # One unit hangs between a slip and very fast fouling, two nats of loss apart: there a hair tips the odds.
    assert (apart / full.std(axis=1)).max() < 0.5
    assert np.median(thin.std(axis=1) / full.std(axis=1)) == pytest.approx(1.0, abs=0.1)
