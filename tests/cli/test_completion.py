"""What a tab offers: commands, options, labels of this record, words of its lists; quickly, and never a traceback."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

from electrolog.cli.completing import completions


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
        (("--db", "nowhere.db", "life", ""), []),
        (("import", ""), []),
        (("nonsense", "B"), []),
        (("life", "100%"), []),
    ],
)
def test_a_tab_offers_what_fits_there(offered: Any, words: tuple[str, ...], expected: list[str]) -> None:
    assert offered(*words) == expected


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


def test_a_tab_takes_little_more_than_starting_python_with_the_terminals_library(cli: Any) -> None:
    """The best of several, taken by turns, since other programs run beside; 1.5 times the floor is hardly noticed."""

    def taken(*arguments: str) -> float:
        environment = {**os.environ, "ELECTROLOG_DB": cli.db}
        start = time.perf_counter()
        subprocess.run([sys.executable, *arguments], check=True, capture_output=True, env=environment)
        return time.perf_counter() - start

    tabs = [("-m", "electrolog.cli.completing", *words) for words in (("life", "B"), ("expose", "--s"), ("c",))]
    rounds = [[taken(*arguments) for arguments in (("-c", "import typer"), *tabs)] for _ in range(8)]
    floor, *best = (min(times) for times in zip(*rounds, strict=True))
    assert max(best) <= 1.5 * floor, (floor, best)
