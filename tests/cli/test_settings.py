"""Settings of a lab and of a person stand in for what isn't typed; nothing is said where nothing is asked."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

POINTS = ("0:0.1", "0.5uM:6.1,6.3", "1uM:12.2", "2uM:24.0")
CALIBRATION = ("calibrate", "B9-01", "pre", "DA", *POINTS, "--at", "2026-02-01T09:00Z")


@pytest.fixture
def own(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("ELECTROLOG_SETTINGS", str(tmp_path / "own" / "settings.toml"))
    return tmp_path / "own" / "settings.toml"


def last(cli: Any) -> dict[str, Any]:
    from electrolog.lab import open_lab

    return dict(max(open_lab(cli.db).rows("calibrations"), key=lambda row: row["id"]))


def test_what_a_person_sets_is_taken_where_nothing_is_typed(cli: Any, own: Path) -> None:
    cli.ok("settings", "rig=north", "by=wren", "waveform=triangle")
    cli.ok(*CALIBRATION)
    assert (last(cli)["rig"], last(cli)["by"], last(cli)["waveform"]) == ("north", "wren", "triangle")
    cli.ok(*CALIBRATION[:-1], "2026-02-02T09:00Z", "--rig", "south")
    assert last(cli)["rig"] == "south"
    cli.ok("settings", "rig=")
    assert cli.ok("settings", "--json").json["in_force"] == {"by": "wren", "waveform": "triangle"}
    assert own.read_text(encoding="utf-8") == 'by = "wren"\nwaveform = "triangle"\n'


def test_a_labs_file_stands_beside_its_record_and_under_the_persons(cli: Any, own: Path) -> None:
    Path(cli.db).with_suffix(".toml").write_text('rig = "north"\nby = "lab"\nwaveform = "triangle"\n', encoding="utf-8")
    cli.ok("settings", "by=wren")
    cli.ok(*CALIBRATION)
    assert (last(cli)["rig"], last(cli)["by"]) == ("north", "wren")
    assert own.exists()


def test_a_zone_is_a_setting_too(cli: Any, own: Path) -> None:
    cli.ok("settings", "zone=Asia/Tokyo", "waveform=triangle")
    cli.ok(*CALIBRATION[:-1], "2026-02-01 09:00")
    assert last(cli)["at"].hour == 0
    assert own.exists()


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("rigg = 'north'", "no setting of .* is called 'rigg'; the nearest known one is 'rig'"),
        ("rig = 3", "rig is no text"),
        ("rig", "is no TOML"),
    ],
)
def test_a_setting_that_is_none_is_refused_with_its_file(cli: Any, own: Path, text: str, said: str) -> None:
    import re

    own.parent.mkdir()
    own.write_text(text, encoding="utf-8")
    refused = cli.refused("shelf")
    assert re.search(said, refused)
    assert own.name in refused


def test_quiet_entries_say_nothing_and_questions_still_answer(cli: Any) -> None:
    assert cli.ok("--quiet", "clean", "B9-01", "-m", "isopropanol", "--at", "2026-02-01T09:00Z").out == ""
    assert "isopropanol" in cli.ok("--quiet", "life", "B9-01").out
    assert "no probe is called" in cli.refused("--quiet", "clean", "nobody", "-m", "isopropanol")


def test_a_zone_that_isnt_one_is_refused_before_it_is_kept(cli: Any) -> None:
    assert "no time zone is called 'Mars/X'" in cli.refused("settings", "zone=Mars/X")
    cli.ok("shelf")
    cli.ok("settings", "zone=Europe/Lisbon")
    cli.ok("settings", "zone=")
