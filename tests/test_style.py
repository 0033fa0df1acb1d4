"""How the code is written: files and functions of a size to take in at once, text that speaks of the project alone."""

from __future__ import annotations

import ast
import re
import statistics
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
FOLDERS = ("electrolog", "migrations", "demo", "tests")
PYTHON = sorted(path for folder in FOLDERS for path in (ROOT / folder).rglob("*.py"))
SHIPPED = [path for path in PYTHON if path.is_relative_to(ROOT / "electrolog")]
TESTS = [path for path in PYTHON if path.name.startswith("test_")]
WORDS = [*PYTHON, *sorted(ROOT.glob("*.md"))]

MOST_LINES_OF_A_FILE = 300
MOST_LINES_OF_A_FUNCTION = 40
MEDIAN_LINES_OF_A_FUNCTION = 6

A_MACHINES_OWN = re.compile(r"(?<![\w.])/(?:work|tmp|home|root|opt|Users)/\w")
A_TICKET = re.compile(r"(?i)\b(?:issue|ticket)s?[ #]+\d+|\(#\d+\)")
TEXT_CALLS = {"open", "read_text", "write_text", "NamedTemporaryFile", "TemporaryFile"}


def short(path: Path) -> str:
    return path.relative_to(ROOT).as_posix()


def text(path: Path) -> str:
    return path.read_text(encoding="utf-8")


def nodes(path: Path) -> Iterator[ast.AST]:
    return ast.walk(ast.parse(text(path), str(path)))


def functions(path: Path) -> list[ast.FunctionDef]:
    return [node for node in nodes(path) if isinstance(node, ast.FunctionDef)]


def length(function: ast.FunctionDef) -> int:
    """Lines of what it does: a command's options and a docstring may take the room they need."""
    documented = ast.get_docstring(function) is not None
    body = function.body[documented:]
    return (body[-1].end_lineno or 0) - body[0].lineno + 1 if body else 0


def test_a_file_answers_one_question() -> None:
    lines = {short(path): len(text(path).splitlines()) for path in SHIPPED}
    assert {name: count for name, count in lines.items() if count > MOST_LINES_OF_A_FILE} == {}


def test_functions_are_short() -> None:
    lines = {f"{short(path)}: {function.name}": length(function) for path in SHIPPED for function in functions(path)}
    assert {name: count for name, count in lines.items() if count > MOST_LINES_OF_A_FUNCTION} == {}
    assert statistics.median(lines.values()) <= MEDIAN_LINES_OF_A_FUNCTION


def test_text_speaks_of_the_project_alone() -> None:
    lines = {f"{short(path)}: {line.strip()}" for path in WORDS for line in text(path).splitlines()}
    assert {line for line in lines if A_MACHINES_OWN.search(line) or A_TICKET.search(line)} == set()


def test_text_files_are_opened_as_utf8() -> None:
    """Without `encoding` a file is read in the machine's own: another text on Windows."""
    calls = [(path, node) for path in PYTHON for node in nodes(path) if isinstance(node, ast.Call)]
    assert [f"{short(path)}:{call.lineno}" for path, call in calls if leaves_encoding_open(call)] == []


def leaves_encoding_open(call: ast.Call) -> bool:
    name = call.func.attr if isinstance(call.func, ast.Attribute) else getattr(call.func, "id", "")
    given = {keyword.arg for keyword in call.keywords}
    if name in ("run", "Popen", "check_output"):
        return bool(given & {"text", "universal_newlines"}) and "encoding" not in given
    if name not in TEXT_CALLS or "encoding" in given or ast.unparse(call.func) == "os.open":
        return False
    modes = [
        value.value for value in [*call.args, *(k.value for k in call.keywords)] if isinstance(value, ast.Constant)
    ]
    return not any(isinstance(mode, str) and re.fullmatch(r"[rwax+]*b[rwax+]*", mode) for mode in modes)


def test_every_test_can_fail() -> None:
    known = {path: {f.name: f for near in path.parent.glob("*.py") for f in functions(near)} for path in TESTS}
    tests = [(path, f) for path in TESTS for f in functions(path) if f.name.startswith("test_")]
    assert [f"{short(path)}: {f.name}" for path, f in tests if not asserts(f, known[path])] == []


def asserts(function: ast.FunctionDef, known: dict[str, ast.FunctionDef], deep: int = 2) -> bool:
    """Itself, or by a function of the same folder that it calls."""
    for node in ast.walk(function):
        if isinstance(node, ast.Assert):
            return True
        if isinstance(node, ast.Call):
            name = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
            if name in ("raises", "warns") or name.startswith("assert_"):
                return True
            if deep and name in known and asserts(known[name], known, deep - 1):
                return True
    return False


@pytest.mark.parametrize(
    ("source", "open_"),
    [
        ("path.read_text()", True),
        ("path.read_text(encoding='utf-8')", False),
        ("open(name)", True),
        ("open(name, 'rb')", False),
        ("path.open(mode='wb')", False),
        ("os.open(name, os.O_WRONLY)", False),
        ("path.open('w', newline='')", True),
        ("subprocess.run(x, text=True)", True),
        ("subprocess.run(x, text=True, encoding='utf-8')", False),
    ],
)
def test_an_open_encoding_is_seen(source: str, open_: bool) -> None:
    (statement,) = ast.parse(source).body
    assert isinstance(statement, ast.Expr)
    assert isinstance(statement.value, ast.Call)
    assert leaves_encoding_open(statement.value) is open_
