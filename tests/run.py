"""Every check, from nothing but Python:  python3 tests/run.py

With arguments, pytest alone, with those arguments:  python3 tests/run.py tests/record -k journal

How fast, beside a floor or a peer in the same run:  python3 tests/run.py --bench [quick | NAME ...]
"""

import os
import subprocess
import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).resolve().parent.parent / "demo"))

import environment  # refuses an old Python, before anything here needs a newer one

LINT = (["ruff", "check"], ["ruff", "format", "--check"], ["mypy"])
MOST_WORKERS = 4


def main(arguments: list[str]) -> int:
    environment.prepare("tests", "postgresql")
    if arguments[:1] == ["--bench"]:
        return module("tests.bench", *arguments[1:])
    lint = [] if arguments else LINT
    statuses = [module(*command) for command in lint]
    workers = str(min(MOST_WORKERS, os.cpu_count() or 1))
    # A path is looked up from the checkout; pytest is last, so that its closing line is what stays in sight.
    statuses.append(module("pytest", "--numprocesses", workers, "--dist", "worksteal", *arguments))
    return max(abs(status) for status in statuses)


def module(*command: str) -> int:
    print("$ python -m " + " ".join(command), flush=True)
    program = [str(environment.PYTHON), "-m", *command]
    variables = one_thread_each() | os.environ
    return subprocess.run(program, check=False, cwd=environment.ROOT, env=variables).returncode


def one_thread_each() -> dict[str, str]:
    """Workers that each start a thread per core slow one another down, and time differently on every machine."""
    return dict.fromkeys(("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"), "1")


if __name__ == "__main__":
    try:
        sys.exit(main(sys.argv[1:]))
    except KeyboardInterrupt:
        sys.exit(130)
