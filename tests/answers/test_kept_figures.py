"""Figures of many new calibrations are kept by the first who asks, and never over what was corrected meanwhile."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from electrolog.answers import figures
from electrolog.answers.shelf import Filter
from electrolog.lab import Lab, open_lab
from electrolog.record import queries, schema
from electrolog.record.queries import Calibration

PROBES = figures.MANY_NEW
PREPARED = {"prepared_at": "2026-01-04T09:00Z"}


@pytest.fixture
def lab(tmp_path: Path) -> Lab:
    folder = tmp_path / "exchange"
    folder.mkdir()
    labels = [f"P{k}" for k in range(PROBES)]
    known = {
        "electrodes.csv": ["electrode", *labels],
        "calibrations.csv": [
            "calibration,electrode,at,stage,analyte,waveform",
            *[f"C{label},{label},2026-01-05T09:00Z,pre,dopamine,triangle" for label in labels],
        ],
        "calibration_points.csv": [
            "calibration,concentration_um,current_na",
            *[f"C{label},{level},{current}" for label in labels for level, current in ((0, 0.1), (1, 9.7), (2, 20.1))],
        ],
    }
    for name, lines in known.items():
        (folder / name).write_text("\n".join(lines) + "\n", encoding="utf-8")
    made = open_lab(str(tmp_path / "lab.db"), create=True)
    made.import_folder(folder)
    return made


def calibrations(lab: Lab) -> list[Calibration]:
    with lab.record.reading() as connection:
        return queries.calibrations(connection)


def test_the_first_who_asks_keeps_them(lab: Lab) -> None:
    assert not [one for one in calibrations(lab) if one.figures is not None]
    lab.shelf(Filter())
    assert len([one for one in calibrations(lab) if one.figures is not None]) == PROBES
    assert lab.recompute() == []
    assert lab.verify().whole


def test_what_was_corrected_meanwhile_is_not_kept(lab: Lab) -> None:
    read = calibrations(lab)
    lab.amend("calibration", "CP0", {"noise_na": "0.1"}, "misread")
    before = next(one.figures for one in calibrations(lab) if one.row["calibration"] == "CP0")
    figures.all_figures(lab.record, read)
    after = {one.row["calibration"]: one.figures for one in calibrations(lab)}
    assert after["CP0"] == before
    assert after["CP1"] is not None
    assert lab.recompute() == []


def amend(what: str, **values: str) -> Callable[[Lab, Path], object]:
    return lambda lab, _: lab.amend(*what.split(), values, "misread", confirmed=True)


def learn_uncertainty(lab: Lab, folder: Path) -> None:
    """By an import, which takes away the figures that rest on the standard and makes none."""
    (folder / "more").mkdir()
    text = (
        "standard,analyte,prepared_at,concentration_um,relative_uncertainty\nS1,dopamine,2026-01-04T09:00Z,1000,0.07\n"
    )
    (folder / "more" / "standards.csv").write_text(text, encoding="utf-8")
    lab.import_folder(folder / "more")


@pytest.mark.parametrize(
    "correct",
    [amend("calibration CP0", noise_na="0.1"), amend("standard S1", relative_uncertainty="0.07"), learn_uncertainty],
)
@pytest.mark.parametrize("kept_before", [True, False])
def test_a_correction_while_all_are_made_again_stands(
    lab: Lab, tmp_path: Path, correct: Callable[[Lab, Path], object], kept_before: bool, monkeypatch: pytest.MonkeyPatch
) -> None:
    """It comes in after the points were read and before anything is kept."""
    lab.log_plain("standards", {"standard": "S1", "analyte": "dopamine", "concentration_um": "1mM", **PREPARED})
    lab.amend("calibration", "CP0", {"standard": "S1", "noise_na": "0.2"}, "from the notebook")
    if kept_before:
        lab.recompute()
    else:
        with lab.record.writing() as writer:
            writer.connection.execute(schema.calibration_figures.delete())
    keep, corrected = figures._keep_unchanged, []

    def keep_after_a_correction(*told: Any) -> set[int]:
        if not corrected:
            corrected.append(correct(lab, tmp_path))
        return keep(*told)

    monkeypatch.setattr(figures, "_keep_unchanged", keep_after_a_correction)
    assert not [change for change in lab.recompute() if change.calibration == "CP0"]
    assert corrected
    assert lab.verify().whole


def test_a_few_are_not_worth_a_write(lab: Lab) -> None:
    figures.all_figures(lab.record, calibrations(lab)[: PROBES - 1])
    assert not [one for one in calibrations(lab) if one.figures is not None]
