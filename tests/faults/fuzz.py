"""Hostile input, by hypothesis: command lines, and files for every reader. Whatever comes, the answer is a refusal in
words or a whole entry: no traceback, no half-written record, no hang.

    python tests/faults/fuzz.py 10000
"""

from __future__ import annotations

import contextlib
import io
import os
import sys
import tempfile
import time
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path
from typing import Any

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

sys.path.insert(0, str(Path(__file__).resolve().parents[2]))

from electrolog.cli.catalogue import HELP, module_of
from electrolog.cli.main import main
from electrolog.lab import Lab, open_lab
from electrolog.record import journal
from tests.faults.right_files import BOOK, EXCHANGE, File, readers

LONGEST_S = 30.0
STATUSES = {0, 1, 2, 10, 20, 30, 130}

# No slash: some commands write where they are told, and this must stay in its own folder.
SIGNS = st.characters(exclude_characters="/\\", exclude_categories=())
AWKWARD = st.sampled_from(
    [
        *("", " ", "-", "--", "---", "nan", "inf", "-inf", "1e999", "1e-400", "-0", "0", "00", "1_000", "١٢", "½"),
        *(
            "1nM",
            "1 µM",
            "1μM",
            "5uM:",
            ":",
            "0:0",
            "1:nan",
            "1:1,,2",
            "4h",
            "-4h",
            "1e30h",
            "0h",
            "999999999min",
            "5%",
        ),
        *(
            "now",
            "99:99",
            "yesterday",
            "yesterday 25:00",
            "2026-02-30T00:00Z",
            "0001-01-01T00:00",
            "1h ago",
            "9e9h ago",
        ),
        *("B1-01", "b1-01", "B1-01..B1-02", "B1-02..B1-01", "B1-01..B9-99", "..", "B1-01,", ",", "B1-1..B1-99999999"),
        *("C0001", "C0001/3", "C0001/", "/3", "1", "-1", "99999999999999999999", "exposure", "calibration", "point"),
        *(
            "dopamine",
            "DA",
            "triangle",
            "in-vivo",
            "PFSA",
            "note=x",
            "=x",
            "x=",
            "=",
            "duration_min=",
            "duration_min=4h",
        ),
        *(
            "=1+1",
            "@SUM(A1)",
            "\x1b[2J",
            "\x00",
            "\ud800",
            "\u202e",
            "\r\n",
            "[/]",
            "[bold]",
            "%s",
            "{0}",
            "'; --",
            "$(x)",
        ),
        *(
            "pre",
            "post",
            "set",
            "unset",
            "adopt",
            "least-share-left",
            "accepted-risk",
            "a" * 5000,
            "💥",
            "é",
            "e\u0301",
        ),
    ]
)
WORDS = AWKWARD | st.text(SIGNS, max_size=30)


@dataclass
class Tally:
    inputs: Counter[str] = field(default_factory=Counter)
    statuses: Counter[int] = field(default_factory=Counter)
    faults: list[str] = field(default_factory=list)
    slowest_s: float = 0.0


class Stream(io.TextIOWrapper):
    def __init__(self) -> None:
        super().__init__(io.BytesIO(), encoding="utf-8", errors="backslashreplace", write_through=True)

    def text(self) -> str:
        return self.buffer.getvalue().decode()  # type: ignore[attr-defined]


def tried(path: Path, arguments: list[str], what: str, tally: Tally) -> None:
    """Runs one command line on the record at `path` and looks at what it left behind."""
    before, began, out, err = head(path), time.perf_counter(), Stream(), Stream()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        status = main(["--db", str(path), *arguments])
    took = time.perf_counter() - began
    tally.inputs[what] += 1
    tally.statuses[status] += 1
    tally.slowest_s = max(tally.slowest_s, took)
    wrong = [
        said
        for said, is_so in {
            f"status {status}": status not in STATUSES,
            "a traceback": "Traceback" in err.text(),
            "an error of its own": "an error in electrolog itself" in err.text(),
            "a refusal without words": status in (1, 2) and not (err.text() or out.text()).strip(),
            "refused and yet written": status in (1, 2) and head(path) != before,
            f"{took:.0f} s": took > LONGEST_S,
        }.items()
        if is_so
    ]
    if wrong:
        tally.faults.append(f"{what} {arguments!r:.300}: {', '.join(wrong)}; {err.text().strip():.300}")


def head(path: Path) -> tuple[int, str]:
    with open_lab(str(path)).record.reading() as connection:
        return journal.head(connection)


def options(name: str) -> list[str]:
    """Every option that a command's own declaration names."""
    import importlib
    import inspect
    import re

    source = inspect.getsource(importlib.import_module(module_of(name)))
    shared = ("--at", "--note", "--by", "--yes", "--json", "--csv", "--why", "--waveform", "--medium", "--analyte")
    return sorted({*re.findall(r'"(--[a-z-]+)"', source), *shared})


OPTIONS = {name: options(name) for name in HELP}


RIGHT = (
    "new --batch B8 --count 2 --made-on 2026-01-05",
    "coat B1-02 -m PFSA --layers 3 --at 2026-01-06T12:00Z",
    "condition B1-02 --for 20min -w triangle --at 2026-01-06T13:00Z",
    "calibrate B1-02 pre DA 0:0.1 0.5uM:6.1,6.3 1uM:12.2 2uM:24 -w triangle --at 2026-01-07T09:00Z --yes",
    "expose B1-02 --for 4h -s in-vivo -w triangle --start 2026-01-08T09:00Z",
    "clean B1-02 -m isopropanol --for 10min --at 2026-01-09T09:00Z",
    "recut B1-02 --length 75um --at 2026-01-10T09:00Z",
    "inspect B1-02 --noise 80pA --seal yes --at 2026-01-11T09:00Z",
    "standard S2 dopamine 10mM --uncertainty 2% --prepared 2026-01-07T08:00Z --expires usual",
    "add setting gel --meaning agar",
    "limits set least-share-left 60% --project P1",
    "amend exposure 1 duration_min=3h --why misread",
    "strike cleaning 1 --why misread",
    "calibrations B1-01 --json",
    "life B1-01",
    "history B1-01 --csv",
    "shelf --json",
    "journal --csv",
    "concentration 3.1nA --calibration C0001",
    "verify --head 0123456789abcdef",
    "list analytes",
    "dilutions 10mM 0.25uM 0.5uM 1uM",
)


@st.composite
def nearly_right(draw: st.DrawFn) -> list[str]:
    """One or two words of a line that was right replaced, left out or added."""
    words = draw(st.sampled_from(RIGHT)).split(" ")
    for _ in range(draw(st.integers(0, 2))):
        place = draw(st.integers(1, len(words)))
        new = draw(st.just([]) | WORDS.map(lambda word: [word]))
        words = [*words[:place], *new, *words[place + draw(st.integers(0, 1)) :]]
    return words


@st.composite
def command_lines(draw: st.DrawFn) -> list[str]:
    if draw(st.booleans()):
        return draw(nearly_right())
    name = draw(st.sampled_from(sorted(HELP)))
    option = st.sampled_from(OPTIONS[name])
    given_option = st.tuples(option, WORDS).map(list) | option.map(lambda one: [one])
    parts = draw(st.lists(WORDS.map(lambda word: [word]) | given_option, max_size=7))
    zone = draw(st.sampled_from([[], [], [], ["--zone", "UTC"], ["--zone", draw(WORDS)]]))
    return [*zone, name, *(word for part in parts for word in part)]


BYTES = st.sampled_from(
    [b"\x00", b"\xff\xfe", b"\xef\xbb\xbf", b'"', b",", b"\n", b"\r", b";", b"=1+1", b"nan", b"1e999", b"-"]
)


@st.composite
def mutated(draw: st.DrawFn, content: bytes) -> bytes:
    """A file that was right, with up to four things done to it; or nothing like one."""
    if draw(st.integers(0, 19)) == 0:
        return draw(st.binary(max_size=300))
    for _ in range(draw(st.integers(1, 4))):
        place, length = draw(st.integers(0, len(content))), draw(st.integers(0, 12))
        new = draw(BYTES | st.binary(max_size=4) | AWKWARD.map(lambda word: word.encode(errors="surrogatepass")))
        content = content[:place] + new + content[place + length :]
    return content


@contextlib.contextmanager
def in_a_deep_folder() -> Iterator[Path]:
    """So that `..` leads nowhere that matters."""
    before = Path.cwd()
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as name:
        folder = Path(name) / "a" / "b" / "c"
        folder.mkdir(parents=True)
        os.chdir(folder)
        try:
            yield folder
        finally:
            os.chdir(before)


@st.composite
def exchange_folders(draw: st.DrawFn) -> dict[str, bytes]:
    """One or two of its files mutated."""
    chosen = draw(st.sets(st.sampled_from(sorted(EXCHANGE)), min_size=1, max_size=2))
    return EXCHANGE | {name: draw(mutated(EXCHANGE[name])) for name in sorted(chosen)}


def run(make: Callable[[Path], Lab], count: int) -> Tally:
    """Half of the inputs are command lines; the other half are files, of each reader as many."""
    files = readers()
    tally, each = Tally(), -(-count // (2 * (len(files) + 1)))
    with in_a_deep_folder() as folder:
        path = folder / "record.db"
        make(path)
        (folder / "right.csv").write_text(BOOK, encoding="utf-8")
        many(count // 2, command_lines(), lambda words: tried(path, words, "command line", tally))
        many(each, exchange_folders(), lambda files: read_folder(path, files, tally))
        for what, file in files.items():
            many(each, mutated(file.content), partial(read_file, path, what, file, tally))
        if not open_lab(str(path)).verify().whole:
            tally.faults.append("the record no longer verifies")
    return tally


def read_folder(path: Path, files: dict[str, bytes], tally: Tally) -> None:
    folder = path.parent / "exchange"
    folder.mkdir(exist_ok=True)
    for name, content in files.items():
        (folder / name).write_bytes(content)
    tried(path, ["import", str(folder)], "exchange folder", tally)


def read_file(path: Path, what: str, file: File, tally: Tally, content: bytes) -> None:
    place = path.parent / file.name
    place.write_bytes(content)
    if file.name == "settings.toml":
        os.environ["ELECTROLOG_SETTINGS"] = str(place)
    try:
        tried(path, file.words, what, tally)
    finally:
        os.environ["ELECTROLOG_SETTINGS"] = os.devnull
        place.unlink()


def many(count: int, inputs: st.SearchStrategy[Any], use: Callable[[Any], None]) -> None:
    """Faults are gathered, not raised: hypothesis would spend its time on making the first one small."""
    limits = settings(
        max_examples=count, database=None, deadline=None, suppress_health_check=list(HealthCheck), derandomize=True
    )

    def one(found: Any) -> None:
        use(found)

    limits(given(inputs)(one))()


if __name__ == "__main__":
    from tests.record.conftest import live

    found = run(lambda path: live(open_lab(str(path), who="wren", create=True)), int([*sys.argv, "10000"][1]))
    print(f"{found.inputs.total()} inputs {dict(found.inputs)}, statuses {dict(sorted(found.statuses.items()))}")
    print(f"slowest {found.slowest_s:.1f} s; {len(found.faults)} faults")
    kinds = {fault.partition("]: ")[2][:100]: fault for fault in found.faults}  # one of each
    print("\n".join(list(kinds.values())[:60]))
