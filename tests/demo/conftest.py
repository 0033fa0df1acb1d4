"""The invented lab, made once: as files, as rows of text, and as the truth behind them."""

from __future__ import annotations

import csv
import importlib
import sys
from collections.abc import Iterator
from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest

DEMO = Path(__file__).parents[2] / "demo"
OTHER_SEEDS = (1, 2, 3)

Rows = dict[str, list[dict[str, str]]]


def read(folder: Path) -> Rows:
    rows = {}
    for path in folder.iterdir():
        with path.open(encoding="utf-8", newline="") as file:
            rows[path.name] = list(csv.DictReader(file))
    return rows


@pytest.fixture(scope="module")
def demo() -> Iterator[SimpleNamespace]:
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(sys, "path", [str(DEMO), *sys.path])
        yield SimpleNamespace(
            make_lab=importlib.import_module("make_lab").make_lab,
            invented_lab=importlib.import_module("invented_lab.lab").invented_lab,
            truth=importlib.import_module("invented_lab.truth").TRUTH,
        )


@pytest.fixture(scope="module")
def folder(demo: SimpleNamespace, tmp_path_factory: pytest.TempPathFactory) -> Path:
    target = tmp_path_factory.mktemp("demo") / "lab"
    demo.make_lab(target)
    return target


@pytest.fixture(scope="module")
def rows(folder: Path) -> Rows:
    return read(folder)


@pytest.fixture(scope="module")
def lab(demo: SimpleNamespace) -> Any:
    return demo.invented_lab(demo.truth["seed"])


@pytest.fixture(scope="module", params=("the lab's own", *OTHER_SEEDS))
def any_rows(
    request: pytest.FixtureRequest, demo: SimpleNamespace, rows: Rows, tmp_path_factory: pytest.TempPathFactory
) -> Rows:
    if request.param == "the lab's own":
        return rows
    target = tmp_path_factory.mktemp("seeded")
    demo.make_lab(target, request.param)
    return read(target)
