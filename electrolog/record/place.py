"""Whether a place may hold a file with the record: who else could write it, and whether its locks are locks."""

from __future__ import annotations

import os
import sqlite3
import stat
import subprocess
import sys
import tempfile
from contextlib import closing
from pathlib import Path

from electrolog.errors import RecordError

# Between machines these share the file, but not the memory in which SQLite keeps the order of its write-ahead log.
_SHARES = {"nfs", "nfs4", "cifs", "smb3", "smbfs", "afs", "fuse.sshfs", "davfs", "fuse.davfs2"}
_ADVICE = (
    "keep the file on this machine's own disk and its backups on the share;"
    " for several rigs let a PostgreSQL server hold the record: `electrolog move`"
)
_MOUNTS = Path("/proc/self/mounts")
_TRY_LOCK = "import sqlite3, sys; sqlite3.connect(sys.argv[1], timeout=0).execute('BEGIN EXCLUSIVE')"


def refuse_unsafe(path: Path) -> None:
    """Raises RecordError for a file that anybody may write, or one on a network share."""
    if os.name == "posix" and path.exists() and path.stat().st_mode & stat.S_IWOTH:
        raise RecordError(f"{path} may be written by everybody on this machine", f"take that away: chmod o-w {path}")
    if _is_shared(path):
        raise RecordError(f"{path} lies on a network share, whose locks don't hold between machines", _ADVICE)


def _is_shared(path: Path) -> bool:
    if sys.platform == "win32":
        import ctypes

        drive = path.resolve().drive
        return drive.startswith("\\\\") or ctypes.windll.kernel32.GetDriveTypeW(f"{drive}\\") == 4  # DRIVE_REMOTE
    return _MOUNTS.exists() and kind_of_mount(path, _MOUNTS.read_text(encoding="utf-8", errors="replace")) in _SHARES


def kind_of_mount(path: Path, mounts: str) -> str:
    """The file system's kind, from lines such as `server:/lab /mnt/lab nfs4 rw 0 0`; the longest mount point wins."""
    resolved, best, kind = path.resolve(), -1, ""
    for line in mounts.splitlines():
        _, point, found, *_ = [*line.split(" "), "", "", ""]
        place = Path(point.replace("\\040", " "))
        if len(place.parts) >= best and resolved.is_relative_to(place):
            best, kind = len(place.parts), found
    return kind


def refuse_lockless(folder: Path) -> None:
    """Tries the folder's locks with a second process, as a second rig would. Raises RecordError where both get one."""
    with tempfile.TemporaryDirectory(prefix=".electrolog-", dir=folder, ignore_cleanup_errors=True) as place:
        tried = Path(place) / "locks.db"
        try:
            with closing(sqlite3.connect(tried, isolation_level=None)) as first:
                first.execute("BEGIN EXCLUSIVE")
                first.execute("CREATE TABLE held (it)")
                second = subprocess.run(  # noqa: S603 -- our own words and our own file
                    [sys.executable, "-c", _TRY_LOCK, str(tried)], check=False, capture_output=True, timeout=60
                )
                first.execute("ROLLBACK")
        except sqlite3.OperationalError as why:
            raise RecordError(f"the folder {folder} gives no locks ({why})", _ADVICE) from None
    if second.returncode == 0:
        raise RecordError(f"the folder {folder} gives the same lock to two at once", _ADVICE)
