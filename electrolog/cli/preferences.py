"""What is taken where nothing is typed: a plain file of the person's, another of the lab's."""

from __future__ import annotations

import os
import re
from collections.abc import Mapping
from pathlib import Path

from electrolog.errors import InputError, unknown
from electrolog.texts import small_text

# What is typed at every entry of a day, and where the record is; nothing that a question's answer would turn on.
KEYS = ("db", "zone", "rig", "by", "medium", "waveform", "setting")
OF_A_LAB = KEYS[1:]
_PASSWORD = re.compile(r"://[^/@?]*:[^/@?]+@|[?&](?:ssl)?password=", re.IGNORECASE)
ENTRIES = ("calibrate", "trace", "scans", "expose", "condition", "again")


def usual_place() -> str:
    """Where the record is when nobody says: the same as for Python users, known before SQLAlchemy is loaded."""
    named = os.environ.get("ELECTROLOG_DB")
    if named:
        return named
    import platformdirs

    return str(platformdirs.user_data_path("electrolog", appauthor=False) / "record.db")


def in_force(db: str | None) -> dict[str, str]:
    """The lab's settings, under the person's own. `db` None: where the person's own say, or the usual place."""
    own = read(own_file(), True)
    lab = lab_file(db or own.get("db"))
    return {**(read(lab, False) if lab is not None else {}), **own}


def own_file() -> Path:
    """Where the platform keeps a person's settings; ELECTROLOG_SETTINGS names another."""
    named = os.environ.get("ELECTROLOG_SETTINGS")
    if named:
        return Path(named)
    import platformdirs

    return platformdirs.user_config_path("electrolog", appauthor=False) / "settings.toml"


def lab_file(db: str | None) -> Path | None:
    """Beside the record, so that everyone who opens it has the same: lab.db, lab.toml."""
    where = db or usual_place()
    return None if "://" in where or not Path(where).name else Path(where).with_suffix(".toml")


def read(path: Path, own: bool) -> dict[str, str]:
    """The settings of one file, none where there is no file. Raises InputError for a setting that isn't one."""
    if not os.path.isfile(path):  # noqa: PTH113 -- of a name that no file can have it says no, and doesn't raise
        return {}
    text = small_text(path, 'lines such as rig = "north"')
    import tomllib

    try:
        found = tomllib.loads(text)
    except tomllib.TOMLDecodeError as why:
        raise InputError(f'{path}: is no TOML ({why}); accepted: lines such as rig = "north"') from None
    return {key: _checked(path, key, value, KEYS if own else OF_A_LAB) for key, value in found.items()}


def _checked(path: Path, key: str, value: object, known: tuple[str, ...]) -> str:
    if key not in known:
        raise unknown(f"setting of {path}", key, known)
    if not isinstance(value, str):
        raise InputError(f'{path}: {key} is no text; accepted: such as {key} = "north"')
    if _PASSWORD.search(value):
        raise InputError(
            f"{path}: {key} holds a password, which is never kept here; accepted: the URL without it",
            "PGPASSFILE or a service file holds it",
        )
    return value


def write(path: Path, changed: Mapping[str, str]) -> None:
    from json import dumps

    checked = {key: _checked(path, key, value, KEYS) for key, value in changed.items()}
    values = {key: value for key, value in {**read(path, True), **checked}.items() if value}
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        lines = [f"{key} = {dumps(value, ensure_ascii=False)}\n" for key, value in values.items()]
        path.write_text("".join(lines), encoding="utf-8")
    except OSError as why:
        raise InputError(f"{path}: can't be written: {why.strerror}", "name another with ELECTROLOG_SETTINGS") from None
