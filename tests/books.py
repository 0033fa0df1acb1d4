"""How each messy book of the tests is read: `python -m tests.books`.

A book counts as right when its calibrations and runs come in as a careful person reads them; the answers that it takes
are those that no cell of it gives.
"""

from __future__ import annotations

import tempfile
from datetime import UTC
from pathlib import Path

from electrolog.lab import Lab, open_lab
from tests.record.messy_books import BOOKS, MessyBook


def main() -> None:
    with tempfile.TemporaryDirectory() as folder:
        for messy in BOOKS:
            place = Path(folder) / messy.name.replace(".", "_")
            place.mkdir()
            messy.make(place / messy.name)
            lab = open_lab(str(place / "lab.db"), zone=UTC, create=True)
            asked = answered(lab, place / messy.name, messy)
            lab.adopt(place / messy.name, commit=True)
            after = f"after {len(asked)} answers ({', '.join(asked)})" if asked else "at once"
            print(f"{messy.name:16} {'right ' + after if is_right(lab, messy) else 'NOT right ' + after}")


def answered(lab: Lab, path: Path, messy: MessyBook) -> list[str]:
    """Answers what is asked, one question after the other, and nothing else."""
    answers: dict[str, str] = {}
    while open_questions := [one.key for one in lab.adopt(path, answers=answers).questions if one.key not in answers]:
        answers[open_questions[0]] = messy.answers[open_questions[0]]
    return list(answers)


def is_right(lab: Lab, messy: MessyBook) -> bool:
    points: dict[str, list[tuple[float, float]]] = {}
    for row in lab.rows("calibration_points"):
        points.setdefault(row["calibration"], []).append((row["concentration_um"], row["current_na"]))
    found = [
        (row["electrode"], row["at"].date().isoformat(), row["stage"], points.get(row["calibration"]) or said(row))
        for row in lab.rows("calibrations")
    ]
    runs = [
        (row["electrode"], row["start"].date().isoformat(), row["duration_min"], row["subject"])
        for row in lab.rows("exposures")
    ]
    wanted = [(*one[:3], round(one[3], 9) if isinstance(one[3], float) else one[3]) for one in messy.calibrations]
    return sorted(found, key=str) == sorted(wanted, key=str) and sorted(runs, key=str) == sorted(messy.runs, key=str)


def said(row: dict[str, float]) -> float:
    return round(row["sensitivity_na_um"], 9)


if __name__ == "__main__":
    main()
