"""What may be thrown away at any time: answers that took long, kept per record where this platform keeps such files."""

from __future__ import annotations

import hashlib
import os
from contextlib import suppress
from pathlib import Path

from electrolog.record.store import Record


def path_of(record: Record, name: str, *words: str) -> Path:
    """`shelf.npz` of this record and of these words; nothing need stand there."""
    where = str(Path(record.name).resolve()) if record.is_file else record.name
    told = hashlib.sha256("\n".join((where, *words)).encode()).hexdigest()[:24]
    kind = Path(name)
    return _folder() / f"{kind.stem}-{told}{kind.suffix}"


def _folder() -> Path:
    """ELECTROLOG_CACHE, or the platform's place."""
    named = os.environ.get("ELECTROLOG_CACHE")
    if named:
        return Path(named)
    import platformdirs

    return platformdirs.user_cache_path("electrolog", appauthor=False)


def write(path: Path, data: bytes) -> None:
    """A cache that can't be written costs time, not the answer."""
    with suppress(OSError):
        path.parent.mkdir(parents=True, exist_ok=True)
        waiting = path.with_suffix(f".{os.getpid()}")
        waiting.write_bytes(data)
        waiting.replace(path)  # at once: another rig may be reading it
