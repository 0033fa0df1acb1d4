"""The virtual environment of demo/run.py and tests/run.py: made once, in the checkout, and anew when it must be.

Standard library only, and no newer syntax: an old Python has to read this file to be refused by it.
"""

import hashlib
import importlib.util
import os
import subprocess
import sys
from contextlib import contextmanager
from pathlib import Path

if sys.version_info < (3, 11):  # noqa: UP036
    sys.exit(
        f"electrolog needs Python 3.11 or newer; this is {sys.version_info[0]}.{sys.version_info[1]}: use a newer one"
    )

ROOT = Path(__file__).resolve().parent.parent
FOLDER = ROOT / ".environment"  # not .venv: that name may hold one that somebody made by hand
VENV = FOLDER / "venv"
PROGRAMS = VENV / ("Scripts" if os.name == "nt" else "bin")
SUFFIX = ".exe" if os.name == "nt" else ""
PYTHON = PROGRAMS / f"python{SUFFIX}"
STAMP = FOLDER / "complete.txt"  # written last: an interrupted installation has none and is begun anew
LOG = FOLDER / "install.log"
WAIT_FOR_ANOTHER_S = 1800


def program(name: str) -> Path:
    return PROGRAMS / f"{name}{SUFFIX}"


def prepare(*extras: str) -> None:
    """Makes the environment with these extras, or leaves it alone when it is there. Ends the program if it can't."""
    _refuse_incomplete_python()
    try:
        FOLDER.mkdir(exist_ok=True)
        with _alone():
            present = _extras_present()
            if present is None or not present.issuperset(extras):
                _install(sorted({*extras, *(present or ())}), anew=present is None)
    except KeyboardInterrupt:
        sys.exit("interrupted; run it again and the environment is made anew")
    except OSError as why:
        sys.exit(f"the environment can't be made: {why}; look whether {FOLDER} may be written, or delete it")


def _refuse_incomplete_python() -> None:
    missing = [name for name in ("venv", "ensurepip", "_sqlite3") if importlib.util.find_spec(name) is None]
    if missing:
        version = f"{sys.version_info[0]}.{sys.version_info[1]}"
        sys.exit(
            f"this Python lacks its module {missing[0].strip('_')}, which the environment needs; on Debian or Ubuntu:"
            f" sudo apt install python{version}-venv; elsewhere: take the whole Python from python.org"
        )


@contextmanager
def _alone():
    """Two commands started at once would tear down each other's half-made environment.

    The system releases a database's lock when its holder ends, however it ends: none is ever left behind.
    """
    import sqlite3

    lock = sqlite3.connect(FOLDER / "lock", timeout=WAIT_FOR_ANOTHER_S, isolation_level=None)
    try:
        lock.execute("BEGIN EXCLUSIVE")
        yield
    except sqlite3.OperationalError as why:
        sys.exit(f"the environment can't be made: {why}; look whether another command is making {FOLDER}, or delete it")
    finally:
        lock.close()


def _extras_present() -> set[str] | None:
    """None when there is no whole environment, or it was made for another project file, interpreter or place."""
    if not STAMP.is_file() or not PYTHON.is_file():
        return None
    fingerprint, *extras = STAMP.read_text(encoding="utf-8").split()
    return set(extras) if fingerprint == _fingerprint() else None


def _fingerprint() -> str:
    # Scripts and the link to the checkout hold whole paths: a folder that was moved needs a new environment.
    parts = (sys.version, sys.base_prefix, str(ROOT))
    text = "\n".join(parts).encode("utf-8", "surrogateescape")
    return hashlib.sha256((ROOT / "pyproject.toml").read_bytes() + text).hexdigest()


def _install(extras: list[str], anew: bool) -> None:
    print(f"setting up the environment in {FOLDER} (once, a few minutes)", file=sys.stderr, flush=True)
    STAMP.unlink(missing_ok=True)
    if anew:
        _run([sys.executable, "-m", "venv", "--clear", str(VENV)], f"delete {FOLDER} and run it again")
    # From inside the checkout, as ".": pip takes a bracket in a path for the beginning of the extras.
    # --no-user: where pip is set to install per user, it would refuse to work inside an environment.
    pip = [str(PYTHON), "-m", "pip", "install", "--no-user", "--quiet", "--editable"]
    target = f".[{','.join(extras)}]" if extras else "."
    _run([*pip, target], "look at the network or pip's settings (pip config list), and run it again")
    _link_to_checkout()
    STAMP.write_text("\n".join([_fingerprint(), *extras]) + "\n", encoding="utf-8")


def _run(command: list[str], remedy: str) -> None:
    done = subprocess.run(command, check=False, cwd=ROOT, stdout=subprocess.PIPE, stderr=subprocess.STDOUT)
    if done.returncode != 0:
        LOG.write_bytes(done.stdout)
        sys.exit(f"the environment can't be made: {_reason(done.stdout)}; {remedy} (all that was said: {LOG})")


def _reason(output: bytes) -> str:
    lines = [line.strip() for line in output.decode("utf-8", "replace").splitlines() if line.strip()]
    errors = [line.removeprefix("ERROR: ") for line in lines if line.startswith("ERROR: ")]
    return (errors or lines or ["no reason was given"])[-1]


def _link_to_checkout() -> None:
    """Before Python 3.13 such a file is read in the machine's own encoding: a checkout below `José` isn't found."""
    for link in VENV.rglob("*electrolog*.pth"):
        link.write_text(f"import sys; sys.path.append({str(ROOT)!a})\n", encoding="ascii")
