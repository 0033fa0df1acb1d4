"""Files longer than a stretch of rows: read and taken in by column, to the same end as row by row."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import pytest

from electrolog.clock import parse_iso, plain_moments
from electrolog.record.exchange_cells import CellReader
from electrolog.record.exchange_files import CHUNK
from electrolog.record.sheets import CALIBRATIONS, POINT_NA
from electrolog.record.store import Record
from electrolog.record.verify import verify
from tests.record.exchange_folders import added, exported, faults_of, new_record, take

LONG = CHUNK + CHUNK // 2
HEADER = "calibration,electrode,at,stage,analyte,waveform"
POINTS_HEADER = "calibration,concentration_um,current_na"


@pytest.fixture
def record(tmp_path: Path) -> Record:
    return new_record(tmp_path)


def rows(count: int = LONG) -> list[str]:
    at = [f"2026-01-05T09:{number // 60 % 60:02d}:{number % 60:02d}Z" for number in range(count)]
    return [f"C{number:05d},P{number % 7},{at[number]},interim,dopamine,triangle" for number in range(count)]


def points(count: int = LONG) -> list[str]:
    return [f"C{number:05d},{level},{number % 13 + 0.5}" for number in range(count) for level in (0, 1)]


def files(calibrations: Sequence[str], of_points: Sequence[str] = ()) -> dict[str, str | bytes]:
    return {
        "electrodes.csv": "electrode\n" + "".join(f"P{number}\n" for number in range(7)),
        "calibrations.csv": "\n".join([HEADER, *calibrations, ""]),
        "calibration_points.csv": "\n".join([POINTS_HEADER, *of_points, ""]),
    }


def test_a_long_file_comes_in_whole_and_goes_out_again(record: Record, tmp_path: Path) -> None:
    report = take(record, tmp_path, files(rows(), points()))
    assert added(report)["calibrations"] == (LONG, 0, 0)
    assert added(report)["calibration_points"] == (2 * LONG, 0, 0)
    with record.reading() as connection:
        assert verify(connection).whole
    again = take(new_record(tmp_path, "again.db"), tmp_path, files(rows()[::-1], points()[::-1]))
    assert added(again)["calibrations"] == (LONG, 0, 0)


def test_known_rows_among_new_ones_are_left_as_they_are(record: Record, tmp_path: Path) -> None:
    every = rows()
    take(record, tmp_path, files(every[::3], [text for place, text in enumerate(points()) if place // 2 % 3 == 0]))
    report = take(record, tmp_path, files(every, points()))
    there = len(every[::3])
    assert added(report)["calibrations"] == (LONG - there, there, 0)
    whole = new_record(tmp_path, "whole.db")
    take(whole, tmp_path, files(every, points()))
    assert exported(record, tmp_path / "one") == exported(whole, tmp_path / "other")


@pytest.mark.parametrize("place", [CHUNK - 1, CHUNK, LONG - 1])
def test_a_label_twice_far_apart_keeps_every_row_out(place: int, record: Record, tmp_path: Path) -> None:
    calibrations = rows()
    calibrations[place] = calibrations[0]
    (fault,) = faults_of(record, tmp_path, files(calibrations))
    assert f"calibrations.csv line {place + 2}, calibration: 'C00000' stands on line 2 already" in fault


def test_a_fault_far_down_is_named_by_its_line(record: Record, tmp_path: Path) -> None:
    """Lines with nothing on them, a cell of two lines and a row of another shape stand before it."""
    calibrations = [*rows(), "C9,P1,2026-01-05T09:00:00Z,sideways,dopamine,triangle"]
    calibrations[2] += "\n"
    calibrations[CHUNK] += ",too many"
    calibrations[CHUNK + 1] = '"C\n1",' + calibrations[CHUNK + 1].partition(",")[2]
    found = faults_of(record, tmp_path, files(calibrations))
    lines = [fault.partition(",")[0] for fault in found]
    assert lines == [f"calibrations.csv line {line}" for line in (CHUNK + 3, CHUNK + 4, LONG + 4)]


@pytest.mark.parametrize(
    "texts",
    [
        ["2026-01-05T09:00:00Z", "2026-01-05 10:00+01:00", "20260105T0900-0530"],
        ["1971-01-01T00:00:00Z", "2198-12-31T23:59:59.999999+14:00"],
    ],
)
def test_moments_read_at_once_are_those_read_one_by_one(texts: list[str]) -> None:
    assert plain_moments(texts) == [parse_iso(text) for text in texts]


@pytest.mark.parametrize(
    "text", ["", "2026-01-05", "2026-01-05T09:00", "soon", "1969-12-31T23:00Z", "2200-01-01T00:00Z"]
)
def test_a_moment_that_needs_a_closer_look_is_not_read_at_once(text: str) -> None:
    assert plain_moments(["2026-01-05T09:00:00Z", text]) is None


@pytest.mark.parametrize(
    "texts", [["1", "-0", "2.5"], ["1", "", "2"], ["1", " 2 "], ["1e400", "1"], ["1_0"], ["nan"], ["x", "1"], [""]]
)
def test_numbers_read_at_once_are_those_read_one_by_one(texts: list[str]) -> None:
    reader = CellReader(POINT_NA, None)
    assert list(map(str, reader.read(texts))) == list(map(str, map(reader._one, texts)))


@pytest.mark.parametrize(
    "texts", [["C1", "C2", ""], ["C1", " C2 "], ["C 1"], ["C\x07"], ["Ä1", "x" * 200], ["x" * 201], ["C\ud800"]]
)
def test_labels_read_at_once_are_those_read_one_by_one(texts: list[str]) -> None:
    column = CALIBRATIONS.by_name["calibration"]
    assert CellReader(column, None).read(texts) == [CellReader(column, None)._one(text) for text in texts]
