"""What a new record knows from the start, against published atomic weights and the rule of CAS check digits."""

from __future__ import annotations

import csv
import re
from pathlib import Path

import pytest

from electrolog.lab import Lab
from electrolog.record.builtin import ANALYTES, WAVEFORMS, WORDS
from electrolog.record.sheets import WORD_KINDS

REFERENCE = Path(__file__).parents[1] / "reference" / "chemistry" / "molar_masses.csv"
# IUPAC abridged standard atomic weights 2021, Pure Appl. Chem. 94 (2022) 573
ATOMIC_WEIGHT = {"H": 1.008, "C": 12.011, "N": 14.007, "O": 15.999}
with REFERENCE.open(encoding="utf-8", newline="") as file:
    PUBLISHED = {row["analyte"]: row for row in csv.DictReader(file)}


def molar_mass(formula: str) -> float:
    return sum(ATOMIC_WEIGHT[atom] * int(count or 1) for atom, count in re.findall(r"([A-Z])(\d*)", formula))


def check_digit(cas: str) -> int:
    """CAS, Check Digit Verification: digits weighed by their place from the right, modulo 10."""
    digits = cas[:-2].replace("-", "")
    return sum(place * int(digit) for place, digit in enumerate(reversed(digits), start=1)) % 10


@pytest.mark.parametrize(("name", "abbreviation", "cas", "mass"), ANALYTES, ids=[row[0] for row in ANALYTES])
def test_an_analytes_mass_and_number_are_the_published_ones(
    name: str, abbreviation: str, cas: str, mass: float
) -> None:
    assert mass == pytest.approx(molar_mass(PUBLISHED[name]["formula"]), abs=0.0005)
    assert cas == PUBLISHED[name]["cas"]
    assert int(cas[-1]) == check_digit(cas)
    assert abbreviation


def test_a_wrong_digit_would_be_seen() -> None:
    assert check_digit("51-61-6") == 6
    assert check_digit("51-16-6") != 6


def test_a_new_record_holds_them(shared: Lab) -> None:
    assert {(row["analyte"], row["cas"], row["molar_mass_g_mol"]) for row in shared.rows("analytes")} == {
        (name, cas, mass) for name, _, cas, mass in ANALYTES
    }
    assert {(row["waveform"], row["vertices_v"], row["scan_rate_v_s"]) for row in shared.rows("waveforms")} == {
        (name, vertices, rate) for name, vertices, rate, _, _ in WAVEFORMS
    }


def test_the_trades_own_waveforms_are_there() -> None:
    """Common practice: triangle at 400 V/s and 10 Hz, N-shaped serotonin sweep at 1000 V/s, its extension to 1.3 V."""
    shapes = {vertices: (rate, frequency) for _, vertices, rate, frequency, _ in WAVEFORMS}
    assert shapes["-0.4 1.3 -0.4"] == (400, 10)
    assert shapes["0.2 1 -0.1 0.2"] == (1000, 10)
    assert shapes["0.2 1.3 -0.1 0.2"] == (1000, 10)


@pytest.mark.parametrize("kind", WORD_KINDS)
def test_every_word_list_starts_with_words_that_differ(kind: str) -> None:
    folded = [word.casefold() for word in WORDS[kind]]
    assert folded
    assert len(folded) == len(set(folded))


def test_names_and_abbreviations_of_analytes_are_not_shared() -> None:
    names = [text.casefold() for name, short, _, _ in ANALYTES for text in (name, short)]
    assert len(names) == len(set(names))
