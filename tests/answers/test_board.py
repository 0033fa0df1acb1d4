"""A large shelf is forecast once and kept: it answers the same, and whatever happens to a probe is seen at once."""

from __future__ import annotations

import time
from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

from electrolog.answers import fits
from electrolog.answers.asked import Run
from electrolog.answers.board import FEWER_DRAWS, LARGE
from electrolog.answers.ranking import Ranked, Ranking
from electrolog.fouling.cohort import fit_cohort
from electrolog.lab import Lab, open_lab
from electrolog.record import seen_by_fit
from tests.answers.fleet_folder import ANALYTE, WAVEFORM, write_fleet
from tests.fouling.fleets.simulate import fleet

PROBES = LARGE + 10
RUN = Run(ANALYTE, WAVEFORM, "in-vivo", 120.0)
LIMITS = {"least-share-left": "60%", "accepted-risk": "5%", "oldest-calibration": "8760h"}


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("board")


@pytest.fixture(scope="module")
def stocked(folder: Path) -> tuple[Lab, datetime, Ranking]:
    """A lab, a moment after its last entry, and the ranking as first made."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("ELECTROLOG_CACHE", str(folder / "cache"))
        lab = open_lab(str(folder / "lab.db"), create=True)
        moment = write_fleet(fleet("exponential", 3, PROBES).events, folder / "exchange")
        lab.import_folder(folder / "exchange")
        keep_a_quick_fit(lab)
        patch.setenv("ELECTROLOG_NOW", moment.isoformat())
        return lab, moment, lab.ranking(RUN, limits=LIMITS, moment=moment)


def keep_a_quick_fit(lab: Lab) -> None:
    """Of a smaller lab of the same kind: which fit is kept matters to the odds, not to what is tested here."""
    with lab.record.reading() as connection:
        assay = fits.assay(connection, ANALYTE, WAVEFORM)
        seen = seen_by_fit.to_be_seen(connection, assay.analyte_id)
    fits.keep(lab.record, assay.analyte_id, fit_cohort(fleet("exponential", 3, 60).events), seen)


@pytest.fixture(autouse=True)
def _at_that_moment(stocked: tuple[Lab, datetime, Ranking], folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("ELECTROLOG_CACHE", str(folder / "cache"))
    monkeypatch.setenv("ELECTROLOG_NOW", stocked[1].isoformat())


def by_label(found: Ranking) -> dict[str, Ranked]:
    return {one.electrode: one for one in found.probes}


def test_it_is_read_in_a_fraction_of_the_time_and_says_the_same(stocked: tuple[Lab, datetime, Ranking]) -> None:
    lab, moment, first = stocked
    began = time.process_time()
    again = lab.ranking(RUN, limits=LIMITS, moment=moment)
    assert time.process_time() - began < 1.0
    assert len(again.probes) == PROBES
    for label, one in by_label(again).items():
        made = by_label(first)[label]
        assert (one.verdict, one.reasons) == (made.verdict, made.reasons)
        assert one.p_breach == pytest.approx(made.p_breach, abs=0.005)


def test_thinned_draws_say_nearly_what_a_check_says(stocked: tuple[Lab, datetime, Ranking]) -> None:
    lab, moment, first = stocked
    labels = [one.electrode for one in first.probes][::10]
    alone = lab.check(labels, RUN, limits=LIMITS, moment=moment)
    apart = [
        abs(one.verdict.p_breach - kept.p_breach)
        for one in alone
        if (kept := by_label(first)[one.electrode]).p_breach is not None and one.verdict.p_breach is not None
    ]
    assert len(apart) > 30
    assert max(apart) < 4 * np.sqrt(0.25 / FEWER_DRAWS)  # four standard errors of a share of so many draws
    assert np.mean(apart) < np.sqrt(0.25 / FEWER_DRAWS)


def test_another_length_and_setting_need_no_new_forecast(stocked: tuple[Lab, datetime, Ranking]) -> None:
    lab, moment, first = stocked
    began = time.process_time()
    longer = lab.ranking(Run(ANALYTE, WAVEFORM, "slice", 600.0), limits=LIMITS, moment=moment)
    assert time.process_time() - began < 1.0
    ends = [
        (one.end_sensitivity_na_um, by_label(longer)[label].end_sensitivity_na_um)
        for label, one in by_label(first).items()
    ]
    assert all(short is not None and long is not None and long < short for short, long in ends)


def test_the_calibrations_age_with_the_moment_asked(stocked: tuple[Lab, datetime, Ranking]) -> None:
    lab, moment, first = stocked
    later = lab.ranking(RUN, limits=LIMITS, moment=moment + timedelta(days=365))
    assert any(one.verdict == "fit" for one in first.probes)
    assert not any(one.verdict == "fit" for one in later.probes)


def test_what_happens_to_a_probe_is_seen_at_once(stocked: tuple[Lab, datetime, Ranking]) -> None:
    lab, moment, first = stocked
    one, other = [probe.electrode for probe in first.probes if probe.verdict == "fit"][:2]
    start = (moment - timedelta(minutes=30)).isoformat()
    lab.log("exposures", [one], {"start": start, "duration_min": "10min", "setting": "in-vivo"}, confirmed=True)
    lab.log("retirements", [other], {"at": start, "reason": "broken"})
    now = by_label(lab.ranking(RUN, limits=LIMITS, moment=moment))
    assert now[one].verdict == "recalibrate"
    assert "0.167 h in in-vivo" in now[one].reasons[0].text
    assert other not in now
    assert len(now) == PROBES - 1


def test_a_spoilt_cache_costs_time_and_nothing_else(stocked: tuple[Lab, datetime, Ranking], folder: Path) -> None:
    lab, moment, first = stocked
    (kept,) = (folder / "cache").glob("shelf-*.npz")
    kept.write_bytes(kept.read_bytes()[:5000])
    again = by_label(lab.ranking(RUN, limits=LIMITS, moment=moment))
    last = first.probes[-1]
    assert again[last.electrode].verdict == last.verdict
