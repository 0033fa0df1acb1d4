"""Text files that people write are read whole, and nothing without an end is."""

from __future__ import annotations

import os
import sys
from pathlib import Path

import pytest

from electrolog.answers.plan import read_plan
from electrolog.cli.points import from_file
from electrolog.cli.preferences import read
from electrolog.errors import InputError
from electrolog.record.books.mapping import read_mapping
from electrolog.texts import MOST_BYTES, small_text

READERS = {
    "settings": lambda path: read(path, True),
    "mapping": read_mapping,
    "plan": lambda path: read_plan(path, None),
    "points": from_file,
}


def test_a_text_is_read_without_its_mark(tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes("\ufeffµ,1\r\n".encode())
    assert small_text(path, "CSV") == "µ,1\r\n"


@pytest.mark.parametrize("reader", READERS)
def test_more_than_anybody_would_write_is_refused(tmp_path: Path, reader: str) -> None:
    path = tmp_path / "large"
    path.touch()
    os.truncate(path, 1 << 40)  # a terabyte of nothing, none of it on the disk
    with pytest.raises(InputError, match=f"larger than {MOST_BYTES // 2**20} MB; accepted: "):
        READERS[reader](path)


@pytest.mark.skipif(sys.platform == "win32", reason="POSIX's devices")
@pytest.mark.parametrize("reader", sorted(set(READERS) - {"settings"}))
def test_what_has_no_end_is_refused(reader: str) -> None:
    with pytest.raises(InputError, match="larger than"):
        READERS[reader](Path("/dev/zero"))


@pytest.mark.parametrize("reader", READERS)
def test_what_is_no_text_is_refused(tmp_path: Path, reader: str) -> None:
    path = tmp_path / "bytes"
    path.write_bytes(b"a = 1\xff")
    with pytest.raises(InputError, match=r"not text in UTF-8 \(byte 5\); accepted: "):
        READERS[reader](path)


@pytest.mark.parametrize("reader", sorted(set(READERS) - {"settings"}))
def test_what_is_not_there_is_refused(tmp_path: Path, reader: str) -> None:
    with pytest.raises(InputError, match=r"can't be read: .*; accepted: "):
        READERS[reader](tmp_path / "none")
