"""Tables fit the width there is and say what they leave out; user text is never markup."""

from __future__ import annotations

import pytest

from electrolog.show.tables import print_lines, print_table, with_error

COLUMNS = ("probe", "state", "note", "share")
ROWS = [("[a12]", "used", "short", "80 %"), ("B1-02", None, "word " * 30, "100 %")]


def printed(capsys: pytest.CaptureFixture[str]) -> list[str]:
    return capsys.readouterr().out.splitlines()


def test_a_table_holds_its_cells_as_they_are(capsys: pytest.CaptureFixture[str]) -> None:
    print_table(COLUMNS, [("[a12] [/]", "[bold]x[/bold]", ":smile: \\[x]", "\x1b[31m")])
    text = "\n".join(printed(capsys))
    assert all(cell in text for cell in ("[a12] [/]", "[bold]x[/bold]", ":smile: \\[x]", r"\x1b[31m"))


@pytest.mark.parametrize("columns", [40, 60, 100, 300])
def test_a_table_fits(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch, columns: int) -> None:
    monkeypatch.setenv("COLUMNS", str(columns))
    print_table(COLUMNS, ROWS, ("share",), ("state",), "note")
    lines = printed(capsys)
    assert max(map(len, lines)) <= columns
    assert [line for line in lines if line != line.rstrip()] == []


def test_the_least_column_goes_first_and_it_is_said(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "46")
    print_table(COLUMNS, ROWS, least=("state", "share"), wrapped="note")
    text = " ".join(printed(capsys))
    assert "used" not in text
    assert "80 %" in text
    assert "no room for: state" in text


def test_what_was_left_out_is_to_be_sought_where_the_command_has_it(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "60")
    print_table(("what", "state"), [("x" * 30, "y" * 40)], least=("state",), other_ways=" or --json")
    assert "(no room for: state; a wider terminal or --json shows all)" in printed(capsys)


def test_numbers_stand_right(capsys: pytest.CaptureFixture[str]) -> None:
    print_table(("a", "n"), [("x", "1"), ("y", "1000")], numeric=("n",))
    lines = printed(capsys)
    assert lines[-2].endswith("   1")
    assert len(lines[-1]) == len(lines[-2])


def test_a_table_without_rows_has_its_head(capsys: pytest.CaptureFixture[str]) -> None:
    print_table(COLUMNS, [])
    assert printed(capsys)[0].split() == list(COLUMNS)


def test_sentences_are_wrapped_and_keep_their_indent(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("COLUMNS", "40")
    print_lines("  " + "word " * 30, "x" * 100, "", "a-b " * 20)
    lines = printed(capsys)
    assert max(map(len, lines)) <= 40
    assert lines[1].startswith("    word")


@pytest.mark.parametrize(
    ("value", "error", "shown"),
    [
        (None, None, "?"),
        (12.4, None, "12.4 ± ?"),
        (12.4, 0.31, "12.40 ± 0.31"),
        (10.0, 0.27, "10.00 ± 0.27"),
        (10.5571, 0.0076, "10.5571 ± 0.0076"),
        (15.8123, 0.0998, "15.81 ± 0.10"),
        (12.36, 9.96, "12 ± 10"),
        (1234.0, 567.0, "1230 ± 570"),
        (0.008187, 0.000032, "0.008187 ± 0.000032"),
        (12.4, 0.0, "12.4 ± 0"),
        (12.4, float("inf"), "12.4 ± inf"),
        (2e7, 3e5, "2.00e+07 ± 300000"),
    ],
)
def test_an_estimate_is_never_shown_as_if_it_were_certain(value: float, error: float, shown: str) -> None:
    assert with_error(value, error) == shown
