"""Small text files that people write: settings, a mapping, a plan, a table of points."""

from __future__ import annotations

from pathlib import Path

from electrolog.errors import InputError

MOST_BYTES = 16 * 2**20


def small_text(path: Path, accepted: str, most_bytes: int = MOST_BYTES) -> str:
    """The whole file, or InputError: can't be read, larger than anybody would have written, no text in UTF-8.

    No more than that is ever read: a device or a pipe has no size to be asked for and no end.
    """
    try:
        with path.open("rb") as file:
            content = file.read(most_bytes + 1)
    except OSError as why:
        raise InputError(f"{path}: can't be read: {why.strerror}; accepted: {accepted}") from None
    if len(content) > most_bytes:
        raise InputError(f"{path.name}: is larger than {most_bytes // 2**20} MB; accepted: {accepted}")
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as why:
        raise InputError(f"{path.name}: is not text in UTF-8 (byte {why.start}); accepted: {accepted}") from None
