"""What a tab offers: commands, options, labels of this record, words of its lists; quickly, and never a traceback."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from electrolog.cli.completing import completions
from electrolog.record.sheets import WORD_KINDS


@pytest.fixture
def offered(cli: Any, monkeypatch: pytest.MonkeyPatch) -> Any:
    monkeypatch.setenv("ELECTROLOG_DB", cli.db)
    return lambda *words: completions(words)


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        (("calib",), ["calibrate", "calibrations"]),
        (("life", "b07-"), ["B07-01", "B07-02", "B07-03"]),
        (("life", "B07-01,B07-"), ["B07-01,B07-01", "B07-01,B07-02", "B07-01,B07-03"]),
        (("check", "B07-01..B07-03"), ["B07-01..B07-03"]),
        (("calibrate", "B07-01", "p"), ["pre", "post"]),
        (("calibrate", "B07-01", "pre", "dop"), ["dopamine"]),
        (("calibrate", "B07-01", "pre", "DA", ""), []),
        (("calibrate", "B07-01", "pre", "DA", "0:1", "--standard", ""), ["S-48-DA"]),
        (("calibrate", "--waveform", "tri"), ["triangle"]),
        (("calibrate", "-w", "triangle", "B07-03"), ["B07-03"]),
        (("clean", "B07-01", "-m", "iso"), ["isopropanol"]),
        (("coat", "B07-01", "-m", "PEDOT:"), ["PEDOT:PFSA"]),
        (("expose", "B07-01", "--setting", ""), ["in-vivo", "slice", "flow-cell"]),
        (("expose", "B07-01", "--set"), ["--setting"]),
        (("expose", "--for", "2h", "B07-02"), ["B07-02"]),
        (("amend", "cal"), ["calibration"]),
        (("amend", "calibration", "C005"), ["C0050"]),
        (("strike", "probe", "B07-0"), ["B07-01", "B07-02", "B07-03"]),
        (("strike", "exposure", ""), []),
        (("list", "wa"), ["waveforms"]),
        (("completion", "f"), ["fish"]),
        (("limits", "a"), ["adopt"]),
        (("dilutions", "S"), ["S-48-DA"]),
        (("backup", ""), []),
        (("runs", "B"), []),
        (("shelf", "B"), []),
        (("--db", "nowhere.db", "life", ""), []),
        (("import", ""), []),
        (("nonsense", "B"), []),
        (("life", "100%"), []),
    ],
)
def test_a_tab_offers_what_fits_there(offered: Any, words: tuple[str, ...], expected: list[str]) -> None:
    assert offered(*words) == expected


def test_what_can_be_added_is_offered(offered: Any) -> None:
    assert offered("add", "") == ["analyte", "waveform", *WORD_KINDS]


def test_the_labs_own_words_are_offered_and_struck_labels_are_not(cli: Any, offered: Any) -> None:
    cli.ok("add", "medium", "brain phantom")
    assert offered("calibrate", "--medium", "br") == ["brain phantom"]
    cli.ok("strike", "standard", "S-48-DA", "--why", "spilt")
    assert offered("calibrate", "--standard", "S") == []


def test_a_record_that_cannot_be_read_offers_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    broken = tmp_path / "broken.db"
    broken.write_bytes(b"not a database")
    monkeypatch.setenv("ELECTROLOG_DB", str(broken))
    assert completions(("life", "B")) == []
    monkeypatch.setenv("ELECTROLOG_DB", "postgresql://nowhere/lab")
    assert completions(("life", "B")) == []


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish", "powershell"])
def test_each_shell_gets_its_script(empty: Any, shell: str) -> None:
    script = empty.ok("completion", shell).out
    assert f"'{sys.executable}' -m electrolog.cli.completing" in script
    assert "{{" not in script
    assert "no shell is called 'tcsh'" in empty.refused("completion", "tcsh")


@pytest.mark.parametrize("shell", ["bash", "zsh", "fish"])
def test_a_shell_takes_its_script(empty: Any, shell: str) -> None:
    if shutil.which(shell) is None:
        pytest.skip(f"{shell} is not installed here")
    script = empty.ok("completion", shell).out
    checked = subprocess.run([shell, "-n"], input=script, encoding="utf-8", capture_output=True, check=False)
    assert (checked.returncode, checked.stderr) == (0, "")


@pytest.mark.skipif(shutil.which("bash") is None, reason="bash is not installed here")
def test_bash_completes_a_label(cli: Any) -> None:
    script = cli.ok("completion", "bash").out
    typed = (
        f'{script}\nCOMP_WORDS=(electrolog life B07-)\nCOMP_CWORD=2\n_electrolog\nprintf "%s\\n" "${{COMPREPLY[@]}}"\n'
    )
    environment = {**os.environ, "ELECTROLOG_DB": cli.db}
    told = subprocess.run(["bash"], input=typed, encoding="utf-8", capture_output=True, env=environment, check=False)
    assert told.stdout.split() == ["B07-01", "B07-02", "B07-03"], told.stderr


@pytest.mark.skipif(shutil.which("bash") is None, reason="bash is not installed here")
def test_bash_takes_a_term_of_two_words_for_one(cli: Any) -> None:
    script = cli.ok("completion", "bash").out
    words = "COMP_WORDS=(electrolog clean --method carbon)\nCOMP_CWORD=3\n_electrolog\n"
    told = shell_told("bash", f'{script}\n{words}printf "%s" "${{COMPREPLY[0]}}"\n', cli.db)
    assert " ".join(told) == "carbon-purified\\ isopropanol"


@pytest.mark.skipif(shutil.which("zsh") is None, reason="zsh is not installed here")
def test_zsh_completes_a_label(cli: Any) -> None:
    script = cli.ok("completion", "zsh").out.replace("compdef _electrolog electrolog\n", "")
    shown = "compadd() { shift; shift; print -l -- $found }\nwords=(electrolog life B07-)\nCURRENT=3\n_electrolog\n"
    assert shell_told("zsh", f"{script}\n{shown}", cli.db) == ["B07-01", "B07-02", "B07-03"]


@pytest.mark.skipif(shutil.which("fish") is None, reason="fish is not installed here")
@pytest.mark.parametrize(
    ("typed", "expected"), [("life B07-0", 3), ("calibrate B07-01 ", 3), ("life B07-01 ", 11), ("import rec", 1)]
)
def test_fish_completes_a_label(cli: Any, typed: str, expected: int) -> None:
    script = cli.ok("completion", "fish").out
    assert len(shell_told("fish", f"{script}\ncomplete -C 'electrolog {typed}'\n", cli.db)) == expected


def shell_told(shell: str, script: str, db: str) -> list[str]:
    environment = {**os.environ, "ELECTROLOG_DB": db}
    told = subprocess.run([shell], input=script, encoding="utf-8", capture_output=True, env=environment, check=False)
    assert told.stderr == ""
    return told.stdout.split()


def test_an_empty_word_in_quotes_is_an_empty_word(cli: Any) -> None:
    typed = [sys.executable, "-m", "electrolog.cli.completing", "clean", "-m", '""']
    environment = {**os.environ, "ELECTROLOG_DB": cli.db}
    told = subprocess.run(typed, encoding="utf-8", capture_output=True, env=environment, check=True)
    assert "isopropanol" in told.stdout.splitlines()


def test_a_tab_takes_little_more_than_starting_python_with_the_terminals_library(cli: Any) -> None:
    """Computing time, the least of several by turns, since other programs run beside; 1.5 times is hardly felt."""
    resource = pytest.importorskip("resource", reason="the time of a finished process is told on POSIX systems alone")

    def spent() -> float:
        used = resource.getrusage(resource.RUSAGE_CHILDREN)
        return float(used.ru_utime + used.ru_stime)

    def taken(*arguments: str) -> float:
        before = spent()
        subprocess.run([sys.executable, *arguments], check=True, capture_output=True, env=environment)
        return spent() - before

    environment = {**os.environ, "ELECTROLOG_DB": cli.db}
    tabs = [("-m", "electrolog.cli.completing", *words) for words in (("life", "B"), ("expose", "--s"), ("c",))]
    rounds = [[taken(*arguments) for arguments in (("-c", "import typer"), *tabs)] for _ in range(8)]
    floor, *best = (min(times) for times in zip(*rounds, strict=True))
    assert max(best) <= 1.5 * floor, (floor, best)
