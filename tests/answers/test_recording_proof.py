"""The proof that a copy of a recording holds all that its source holds."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest

from electrolog.answers.recordings.proof import refuse_unequal
from electrolog.answers.recordings.working_copy import working_copy
from electrolog.errors import ElectrologError, InputError

OURS = ("ours",)


@pytest.fixture
def source(tmp_path: Path) -> Path:
    path = tmp_path / "source.h5"
    with h5py.File(path, "w") as file:
        file.attrs["about"] = "a file"
        file.create_dataset("plain", data=np.array([1.0, np.nan, -0.0]))
        file.create_dataset("packed", data=np.arange(1000), chunks=(100,), compression="gzip")
        file.create_dataset("texts", data=["a", "b"], dtype=h5py.string_dtype())
        file.create_dataset("scalar", data=3)
        pair = np.dtype([("place", "i4"), ("at", h5py.ref_dtype)])
        refers = file.create_dataset("refers", shape=(1,), dtype=pair)
        refers[0] = (7, file["plain"].ref)
        file["plain"].attrs["beside"] = file["packed"].ref
        file["ours/x"] = 1
        file["soft"] = h5py.SoftLink("/ours/x")
    return path


def changed(source: Path, change: Callable[[Any], object]) -> Path:
    copy = Path(shutil.copy(source, source.with_name("copy.h5")))
    with h5py.File(copy, "r+") as file:
        change(file)
    return copy


def _set(name: str, place: Any, value: Any) -> Callable[[Any], object]:
    return lambda file: file[name].__setitem__(place, value)


def _again(name: str, value: Any) -> Callable[[Any], object]:
    def change(file: Any) -> None:
        del file[name]
        file[name] = value

    return change


def test_what_is_added_and_what_is_ours_may_differ(source: Path) -> None:
    def change(file: Any) -> None:
        file["new/x"] = 1
        _again("ours/x", 2)(file)

    copy = changed(source, change)
    refuse_unequal(source, copy, OURS)
    with pytest.raises(ElectrologError, match="ours/x would"):
        refuse_unequal(source, copy, ())


@pytest.mark.parametrize(
    ("change", "place"),
    [
        (_set("plain", 0, 2.0), "plain"),
        (_set("plain", 2, 0.0), "plain"),
        (_set("packed", 999, 0), "packed"),
        (_set("texts", 1, "c"), "texts"),
        (_set("scalar", (), 4), "scalar"),
        (_again("scalar", 3.0), "scalar"),
        (lambda file: file.__delitem__("packed"), "packed"),
        (lambda file: file.attrs.__setitem__("about", "another"), "/"),
        (lambda file: file["plain"].attrs.__setitem__("more", 1), "plain"),
        (lambda file: file["plain"].attrs.__setitem__("beside", file["texts"].ref), "plain"),
        (lambda file: file["refers"].__setitem__(0, (7, file["texts"].ref)), "refers"),
        (lambda file: file["refers"].__setitem__(0, (8, file["plain"].ref)), "refers"),
        (lambda file: file["ours"].__delitem__("x"), "/soft"),
    ],
)
def test_any_other_difference_is_named(source: Path, change: Callable[[Any], object], place: str) -> None:
    with pytest.raises(ElectrologError, match=rf"{place} would "):
        refuse_unequal(source, changed(source, change), OURS)


def test_a_copy_takes_its_place_whole_or_not_at_all(source: Path) -> None:
    target = source.with_name("target.h5")
    with pytest.raises(ZeroDivisionError), working_copy(source, target, False) as copy:
        copy.write_bytes(b"half" * (1 // 0))
    assert sorted(path.name for path in source.parent.iterdir()) == ["source.h5"]
    with working_copy(source, target, False) as copy:
        copy.write_bytes(b"whole")
    assert target.read_bytes() == b"whole"
    with pytest.raises(InputError, match="is there already"), working_copy(source, target, False):
        pass
    with working_copy(source, target, True) as copy:
        copy.write_bytes(b"new")
    assert target.read_bytes() == b"new"
    assert sorted(path.name for path in source.parent.iterdir()) == ["source.h5", "target.h5"]


def test_a_disk_without_room_is_noticed_before_anything_is_written(source: Path) -> None:
    target = source.with_name("target.h5")
    with (
        pytest.raises(ElectrologError, match="the copy needs 1e"),
        working_copy(source, target, False, more_bytes=10**18),
    ):
        pass
    assert sorted(path.name for path in source.parent.iterdir()) == ["source.h5"]


def test_what_a_killed_process_left_is_swept_a_day_later(source: Path) -> None:
    target = source.with_name("target.h5")
    names = (".target-old.part", ".target-new.part", ".another-old.part")
    for name in names:
        source.with_name(name).write_bytes(b"half a copy")
        if "old" in name:
            os.utime(source.with_name(name), (0, 0))
    with working_copy(source, target, False):
        pass
    assert sorted(path.name for path in source.parent.iterdir() if path.name in names) == sorted(names[1:])


def test_a_source_that_changes_meanwhile_is_noticed(source: Path) -> None:
    with (
        pytest.raises(InputError, match="was changed by another program meanwhile"),
        working_copy(source, source, True),
        source.open("ab") as file,
    ):
        file.write(b"more")
    assert source.read_bytes().endswith(b"more")
