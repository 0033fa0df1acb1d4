"""The invented lab is the same everywhere, keeps to the exchange folder's contract, and holds what it promises."""

from __future__ import annotations

import os
import subprocess
import sys
from collections import Counter, defaultdict
from datetime import date, datetime
from pathlib import Path
from types import SimpleNamespace

MAKE_LAB = Path(__file__).parents[2] / "demo" / "make_lab.py"

# The contract, written out a second time on purpose: the program under test has its own copy.
CONTRACT = {
    "terms.csv": "kind,term,meaning",
    "analytes.csv": "analyte,abbreviation,cas,molar_mass_g_mol,note",
    "waveforms.csv": "waveform,vertices_v,scan_rate_v_s,frequency_hz,note",
    "batches.csv": "batch,made_on,made_by,fibre,fibre_diameter_um,insulation,seal,backfill,note",
    "electrodes.csv": "electrode,batch,geometry,exposed_length_um,diameter_um,note",
    "inspections.csv": "electrode,at,exposed_length_um,seal_ok,background_na,noise_na,note",
    "coatings.csv": "electrode,at,material,method,potential_v,duration_s,concentration_wt_pct,layers,"
    "cure_temperature_c,cure_min,note",
    "conditionings.csv": "electrode,at,waveform,duration_min,medium,note",
    "cleanings.csv": "electrode,at,method,duration_min,note",
    "recuts.csv": "electrode,at,exposed_length_um,note",
    "standards.csv": "standard,analyte,prepared_at,concentration_um,relative_uncertainty,diluent,expires_at,note",
    "calibrations.csv": "calibration,electrode,at,stage,analyte,waveform,medium,temperature_c,standard,rig,by,"
    "noise_na,background_na,oxidation_peak_v,reduction_peak_v,sensitivity_na_um,sensitivity_se_na_um,note",
    "calibration_points.csv": "calibration,concentration_um,current_na",
    "exposures.csv": "electrode,start,duration_min,setting,waveform,medium,subject,recording,by,note",
    "retirements.csv": "electrode,at,reason,note",
}
REQUIRED = {
    "terms.csv": "kind term",
    "analytes.csv": "analyte",
    "waveforms.csv": "waveform vertices_v scan_rate_v_s frequency_hz",
    "batches.csv": "batch",
    "electrodes.csv": "electrode",
    "inspections.csv": "electrode at",
    "coatings.csv": "electrode at material",
    "conditionings.csv": "electrode at",
    "cleanings.csv": "electrode at method",
    "recuts.csv": "electrode at",
    "standards.csv": "standard analyte prepared_at concentration_um",
    "calibrations.csv": "calibration electrode at stage analyte waveform",
    "calibration_points.csv": "calibration concentration_um current_na",
    "exposures.csv": "electrode start duration_min setting",
    "retirements.csv": "electrode at reason",
}
BUILT_IN_WORDS = {
    "fibre": {"carbon fibre 7 um", "carbon fibre 5 um"},
    "insulation": {"glass capillary", "fused silica"},
    "seal": {"pulled glass", "epoxy"},
    "coating material": {"PFSA", "PEDOT:PFSA"},
    "coating method": {"dip", "electrodeposition"},
    "medium": {"aCSF", "PBS", "tris buffer"},
    "setting": {"in-vivo", "slice", "flow-cell"},
    "cleaning method": {"isopropanol", "extended triangle cycling", "carbon-purified isopropanol"},
    "retirement reason": {"broken", "lost", "fouled", "noisy", "seal failed"},
}
WORDS_IN = [
    ("batches.csv", "fibre", "fibre"),
    ("batches.csv", "insulation", "insulation"),
    ("batches.csv", "seal", "seal"),
    ("coatings.csv", "material", "coating material"),
    ("coatings.csv", "method", "coating method"),
    ("conditionings.csv", "medium", "medium"),
    ("calibrations.csv", "medium", "medium"),
    ("exposures.csv", "medium", "medium"),
    ("exposures.csv", "setting", "setting"),
    ("cleanings.csv", "method", "cleaning method"),
    ("retirements.csv", "reason", "retirement reason"),
]

Rows = dict[str, list[dict[str, str]]]


def bytes_of(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in folder.iterdir()}


def moment(text: str) -> datetime:
    return datetime.fromisoformat(text)


# ── the same everywhere ──


def test_the_program_alone_with_bare_python_writes_the_same_bytes(folder: Path, tmp_path: Path) -> None:
    # -S hides every installed package: the lab can be made before anything is installed.
    target = tmp_path / "lab of another run"
    command = [sys.executable, "-S", str(MAKE_LAB), str(target)]
    subprocess.run(command, check=True, capture_output=True, env=os.environ | {"PYTHONHASHSEED": "7"})
    assert bytes_of(target) == bytes_of(folder)


def test_another_seed_makes_another_lab_and_the_same_seed_the_same(demo: SimpleNamespace, tmp_path: Path) -> None:
    for name, seed in (("a", 5), ("b", 5), ("c", 6)):
        demo.make_lab(tmp_path / name, seed)
    assert bytes_of(tmp_path / "a") == bytes_of(tmp_path / "b") != bytes_of(tmp_path / "c")


# ── the contract ──


def test_files_and_columns_are_those_of_the_exchange_folder(folder: Path) -> None:
    headers = {path.name: path.read_bytes().split(b"\r\n")[0].decode() for path in folder.iterdir()}
    assert headers == CONTRACT


def test_every_required_cell_is_filled_and_every_table_has_rows(rows: Rows) -> None:
    for name, columns in REQUIRED.items():
        assert rows[name], name
        for row in rows[name]:
            assert all(row[column] for column in columns.split()), (name, row)


def test_labels_are_unique(any_rows: Rows) -> None:
    for name, column in [
        ("batches.csv", "batch"),
        ("electrodes.csv", "electrode"),
        ("standards.csv", "standard"),
        ("calibrations.csv", "calibration"),
        ("retirements.csv", "electrode"),
    ]:
        labels = [row[column] for row in any_rows[name]]
        assert len(labels) == len(set(labels)), name


def test_every_reference_resolves(any_rows: Rows) -> None:
    for home, column in [
        ("batches.csv", "batch"),
        ("electrodes.csv", "electrode"),
        ("standards.csv", "standard"),
        ("calibrations.csv", "calibration"),
        ("analytes.csv", "analyte"),
        ("waveforms.csv", "waveform"),
    ]:
        known = {row[column] for row in any_rows[home]}
        for name, table in any_rows.items():
            assert {row[column] for row in table if row.get(column)} <= known, (name, column)


def test_every_word_is_built_in_or_one_of_the_labs_own(rows: Rows) -> None:
    own = {(row["kind"], row["term"]) for row in rows["terms.csv"]}
    used = set()
    for name, column, kind in WORDS_IN:
        found = {row[column] for row in rows[name]} - {""}
        assert found <= BUILT_IN_WORDS[kind] | {term for of, term in own if of == kind}, (name, column)
        used |= {(kind, word) for word in found}
    assert own <= used, "a word of the lab's that nobody uses"


def test_a_standard_holds_the_analyte_it_calibrates_and_is_within_its_use_by(any_rows: Rows) -> None:
    standards = {row["standard"]: row for row in any_rows["standards.csv"]}
    for row in any_rows["calibrations.csv"]:
        standard = standards[row["standard"]]
        assert standard["analyte"] == row["analyte"]
        assert moment(standard["prepared_at"]) < moment(row["at"]) < moment(standard["expires_at"])


def test_a_calibration_has_points_or_a_factor_never_both(any_rows: Rows, demo: SimpleNamespace) -> None:
    with_points = {row["calibration"] for row in any_rows["calibration_points.csv"]}
    with_factor = {row["calibration"] for row in any_rows["calibrations.csv"] if row["sensitivity_na_um"]}
    assert with_factor == set(demo.truth["slips"]["factor_only"])
    assert not with_factor & with_points
    assert with_factor | with_points == {row["calibration"] for row in any_rows["calibrations.csv"]}


def test_points_have_four_to_six_concentrations_with_replicates_in_some(any_rows: Rows) -> None:
    points = defaultdict(list)
    for row in any_rows["calibration_points.csv"]:
        points[row["calibration"]].append(float(row["concentration_um"]))
    assert all(4 <= len(set(concentrations)) <= 6 for concentrations in points.values())
    replicated = sum(len(set(c)) < len(c) for c in points.values())
    assert 0.25 < replicated / len(points) < 0.65


# ── what was promised ──


def test_sixty_probes_in_eight_batches_over_fourteen_months(rows: Rows) -> None:
    labels = [row["electrode"] for row in rows["electrodes.csv"]]
    assert len(labels) == 60
    assert [row["batch"] for row in rows["batches.csv"]] == [f"B{n:02d}" for n in range(1, 9)]
    assert labels[0] == "B01-01"
    days = sorted(moment(row["at"]).date() for row in rows["calibrations.csv"])
    assert days[0] < date(2025, 9, 30)
    assert days[-1] > date(2026, 10, 15)
    assert [row["calibration"] for row in rows["calibrations.csv"][:2]] == ["C0001", "C0002"]


def test_two_coatings_and_none_with_every_waveform(rows: Rows) -> None:
    coated = {row["electrode"]: row["material"] for row in rows["coatings.csv"]}
    seen = {(row["waveform"], coated.get(row["electrode"], "none")) for row in rows["calibrations.csv"]}
    waveforms = {row["waveform"] for row in rows["waveforms.csv"]}
    assert waveforms == {"triangle", "serotonin-n", "serotonin-n-extended"}
    assert seen == {(w, c) for w in waveforms for c in ("none", "PFSA", "PEDOT:PFSA")}


def test_in_vivo_and_slice_fill_the_exposures(rows: Rows) -> None:
    settings = Counter(row["setting"] for row in rows["exposures.csv"])
    assert min(settings["in-vivo"], settings["slice"]) > 5 * settings["flow-cell"] > 0


def test_every_kind_of_event_and_ending_occurs(rows: Rows, demo: SimpleNamespace) -> None:
    methods = {row["method"] for row in rows["cleanings.csv"]}
    assert methods == set(demo.truth["life"]["cleaning_share"])
    assert {row["reason"] for row in rows["retirements.csv"]} == {
        "broken", "lost", "fouled", "noisy", "seal failed", "tip bent",
    }  # fmt: skip
    assert {row["stage"] for row in rows["calibrations.csv"]} == {"pre", "interim", "post"}
    assert max(Counter(row["electrode"] for row in rows["coatings.csv"]).values()) == 2, "a re-coating"
    assert {row["seal_ok"] for row in rows["inspections.csv"]} == {"yes", "no"}
    made = {row["electrode"]: float(row["exposed_length_um"]) for row in rows["electrodes.csv"]}
    assert all(float(row["exposed_length_um"]) < made[row["electrode"]] for row in rows["recuts.csv"])


def test_probes_have_none_to_seven_calibrations_and_some_wait_with_one(any_rows: Rows) -> None:
    count = Counter(row["electrode"] for row in any_rows["calibrations.csv"])
    gone = {row["electrode"] for row in any_rows["retirements.csv"]}
    exposed = {row["electrode"] for row in any_rows["exposures.csv"]}
    labels = {row["electrode"] for row in any_rows["electrodes.csv"]}
    assert max(count.values()) == 7
    assert sum(n >= 2 for n in count.values()) >= 40
    assert 1 <= sum(not count[label] for label in labels) <= 8
    assert {label for label in labels - gone - exposed if count[label] == 1}


def test_no_calibration_covers_the_end_of_some_runs(rows: Rows) -> None:
    last_run = {row["electrode"]: moment(row["start"]) for row in rows["exposures.csv"]}
    last_read = {row["electrode"]: moment(row["at"]) for row in rows["calibrations.csv"]}
    unread = {label for label, start in last_run.items() if last_read[label] < start}
    reasons = {row["electrode"]: row["reason"] for row in rows["retirements.csv"]}
    assert unread
    assert {reasons[label] for label in unread} == {"broken", "lost"}
