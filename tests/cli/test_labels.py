"""Stickers: read back by an independent reader, and what a scanner sends is taken wherever a probe is named."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from electrolog.lab import open_lab
from electrolog.record.names import as_scanned


def read_back(path: Path) -> list[str]:
    """By ZXing's reader (zxing-cpp), which shares no code with what made the codes."""
    import zxingcpp
    from PIL.Image import open as opened

    return [one.text for one in zxingcpp.read_barcodes(opened(path))]


def test_codes_say_the_labels_and_nothing_else(cli: Any, tmp_path: Path) -> None:
    cli.ok("new", "Würfel µ/3 <b>")
    answer = cli.ok("labels", "B07-01..B07-03", "Würfel µ/3 <b>", "--out", str(tmp_path / "stickers.png"))
    assert "4 stickers on 1 page" in " ".join(answer.out.split())
    assert sorted(read_back(tmp_path / "stickers.png")) == ["B07-01", "B07-02", "B07-03", "Würfel µ/3 <b>"]


def test_a_full_sheet_of_small_ones_is_read(cli: Any, tmp_path: Path) -> None:
    cli.ok("new", "--batch", "S1", "--count", "60")
    cli.ok("labels", "S1-01..S1-60", "--size", "14mm", "--paper", "letter", "--out", str(tmp_path / "s.png"))
    assert sorted(read_back(tmp_path / "s.png")) == [f"S1-{k:02d}" for k in range(1, 61)]


def test_pdf_and_svg_are_vectors_of_the_papers_size(cli: Any, tmp_path: Path) -> None:
    for name in ("s.svg", "s.pdf"):
        cli.ok("labels", "B07-01", "--out", str(tmp_path / name))
    svg = (tmp_path / "s.svg").read_text(encoding="utf-8")
    assert 'width="595.27' in svg  # 210 mm in points
    assert "B07-01" in svg
    assert "<image" not in svg
    assert (tmp_path / "s.pdf").read_bytes().startswith(b"%PDF")


def test_more_than_a_sheet_needs_a_pdf(cli: Any, tmp_path: Path) -> None:
    cli.ok("new", "--batch", "S1", "--count", "90")
    assert "accepted: up to 80 here, or a .pdf" in cli.refused(
        "labels", "S1-01..S1-90", "--out", str(tmp_path / "s.svg")
    )
    found = cli.ok("labels", "S1-01..S1-90", "--out", str(tmp_path / "s.pdf"), "--json").json
    assert (found["stickers"], found["pages"]) == (90, 2)


@pytest.mark.parametrize(
    ("option", "value", "said"),
    [("--size", "2mm", "8 to 60 mm"), ("--paper", "a3", "a4, letter"), ("--out", "x.doc", "accepted: .png")],
)
def test_what_no_sheet_can_be_is_refused(cli: Any, option: str, value: str, said: str) -> None:
    out = () if option == "--out" else ("--out", "s.pdf")
    assert said in cli.refused("labels", "B07-01", *out, option, value)


@pytest.mark.parametrize("sent", ["B07-01", "]Q1B07-01", " B07-01\r", "]Q3b07-01 "])
def test_what_a_scanner_sends_is_a_probe_wherever_one_is_named(cli: Any, sent: str) -> None:
    assert cli.ok("history", sent, "--json").json[0]["electrode"] == "B07-01"
    assert "B07-01, batch B07" in cli.ok("life", sent).out
    out = cli.ok("expose", sent, "--for", "1h", "-s", "in-vivo", "--start", "2026-02-01T09:00Z").out
    assert "B07-01" in out
    more = ("0:0.1", "1uM:9", "2uM:18.1", "--at", "2026-02-02T09:00Z", "-w", "triangle", "-y")
    assert cli.ok("calibrate", sent, "post", "DA", *more, "--json").json["electrode"] == "B07-01"
    assert cli.ok("note", sent, "seen").out
    assert open_lab(cli.db).labels([sent]) == ["B07-01"]


def test_a_label_that_a_scanner_would_turn_into_another_is_refused(cli: Any) -> None:
    assert "B07-01" in cli.refused("new", "]Q1B07-01")


def test_only_a_scanners_own_signs_are_taken_off() -> None:
    assert [as_scanned(text) for text in ("]Q1A", "]A", "Q1A", " A B ", "")] == ["A", "]A", "Q1A", "A B", ""]
