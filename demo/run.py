"""The main job on an invented lab, command by command:  python3 demo/run.py

Sets up its own environment, builds the lab anew, and prints each command before it runs it.
"""

import os
import shlex
import shutil
import subprocess
import sys
from pathlib import Path
from typing import NamedTuple

import environment  # refuses an old Python, before anything here needs a newer one

DEMO = Path(__file__).resolve().parent
EXPORTED = DEMO / "exported"
TODAY = "2026-11-02T08:00:00+00:00"  # the morning after the invented lab's last week: the same answers on any day

REFUSED, RECALIBRATE, UNDETERMINED = 2, 10, 30  # what `check` says to a script by its exit status


class Step(NamedTuple):
    why: str
    command: str  # as it is typed after `electrolog --db demo/lab.db`
    status: int | None = 0  # None: whatever the odds say


STEPS = [
    Step("Fourteen months of a lab's notebooks come in, in one transaction.", "import demo/lab"),
    Step("What is on the shelf: each probe with its state, exposure, last calibration and share left.", "shelf"),
    Step("One probe's life, as it happened.", "life B08-02"),
    Step("How its sensitivity went.", "history B08-02"),
    Step("What each of its calibrations said, with errors and detection limits.", "calibrations B08-02"),
    Step(
        "This morning's calibration, typed between injections: concentration, colon, current, replicates.",
        "calibrate B08-02 pre DA 0:0.10,0.06 0.25uM:4.41 0.5uM:8.71,8.80 1uM:17.3 2uM:34.8 --rig north --by wren"
        " --at '2026-11-02 07:30Z'",
    ),
    Step(
        "A slip of the unit is asked about; with nobody to answer, nothing is written (exit status 2).",
        "calibrate B08-02 pre DA 0:0.1 250:4.4 500:8.7 1000:17.3 --at '2026-11-02 07:40Z'",
        REFUSED,
    ),
    Step(
        "What it will still see after 2 h in vivo: its true sensitivity, now and then. (The first forecast fits"
        " the whole cohort, and keeps the fit.)",
        "forecast B08-02 --analyte dopamine --waveform triangle --setting in-vivo --run 2h",
    ),
    Step(
        "Is it fit for that run? The lab has set no limits yet, so it can't be said (exit status 30).",
        "check B08-02 --analyte dopamine --waveform triangle --setting in-vivo --run 2h",
        UNDETERMINED,
    ),
    Step("So the lab says what it asks of a probe, in its own numbers.", "limits set least-share-left 50%"),
    Step("Two more it takes from common practice: the age of a calibration,", "limits adopt oldest-calibration"),
    Step("and the risk that it accepts.", "limits adopt accepted-risk"),
    Step(
        "Now the answer, with its odds and reasons, and the longest run that holds.",
        "check B08-02 --analyte dopamine --waveform triangle --setting in-vivo --run 2h --needs 50nM",
        None,
    ),
    Step(
        "And of a probe that was cleaned since its last calibration.",
        "check B07-01 --analyte dopamine --waveform triangle --setting in-vivo --run 2h --needs 50nM",
        RECALIBRATE,
    ),
    Step(
        "The slip in the record is corrected: the old value, who, when and why are kept.",
        "strike calibration C0212 --why 'points typed in nM'",
    ),
    Step("Has anybody changed the record behind its back? The journal is replayed against it.", "verify"),
    Step("The whole record goes out again as plain files that any other program reads.", "export demo/exported"),
]


def main() -> int:
    environment.prepare()
    remove_earlier_run()
    if status := python("demo/make_lab.py", "demo/lab"):
        return status
    print(f"\nTo type these commands yourself, in the folder that holds README.md: {activation()}")
    for step in STEPS:
        status = run(step)
        if step.status is not None and status != step.status:
            print(f"this step was to end with status {step.status}, but ended with {status}", file=sys.stderr)
            return 1
    return 0


def remove_earlier_run() -> None:
    try:
        for file in DEMO.glob("lab.db*"):
            file.unlink()
        shutil.rmtree(EXPORTED, ignore_errors=True)
    except OSError as why:
        sys.exit(f"the earlier demo can't be removed: {why}; close what has it open")


def python(*arguments: str) -> int:
    return subprocess.run([str(environment.PYTHON), *arguments], check=False, cwd=environment.ROOT).returncode


def activation() -> str:
    programs = environment.PROGRAMS.relative_to(environment.ROOT)
    return str(programs / "activate") if os.name == "nt" else f"source {programs / 'activate'}"


def run(step: Step) -> int:
    command = f"electrolog --db demo/lab.db {step.command}"
    print(f"\n{step.why}\n$ {command}", flush=True)
    name, *arguments = shlex.split(command)
    variables = os.environ | {"ELECTROLOG_NOW": TODAY}
    program = [str(environment.program(name)), *arguments]
    return subprocess.run(program, check=False, cwd=environment.ROOT, env=variables).returncode


if __name__ == "__main__":
    try:
        sys.exit(main())
    except KeyboardInterrupt:
        sys.exit(130)
