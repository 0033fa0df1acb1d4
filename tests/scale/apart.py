"""Two machines fit two cohorts of one record at once, and then both the same:

    python -m tests.scale.apart WHERE ANALYTE ANALYTE

Each is a process of its own and says when it began, when it had read its cohort, when its fit was kept, and how much
processor's time that took: on a machine with a processor for each, neither waits for the other but to keep its fit.
"""

from __future__ import annotations

import json
import subprocess
import sys
import time

from electrolog.answers import fits
from electrolog.answers.fitting import whole_cohort
from electrolog.lab import open_lab
from electrolog.record import kept_fits


def fit(where: str, analyte: str) -> None:
    """One machine's part; what it did, and when, as JSON."""
    begun, began_s = time.time(), time.process_time()
    lab = open_lab(where)
    with lab.record.reading() as connection:
        asked = whole_cohort(connection, analyte)
    known = fits.gathered(lab.record, asked)
    gathered = time.time()
    made = fits.fit_for(lab.record, asked, fresh=True, known=known)
    with lab.record.reading() as connection:
        kept = kept_fits.kept_fit(connection, asked.analyte_id)
    spent = time.process_time() - began_s
    said = {"analyte": analyte, "units": made.n_units, "from": begun, "gathered": gathered, "to": time.time()}
    print(json.dumps({**said, "processor_s": spent, "kept": kept is not None and kept.fingerprint == made.fingerprint}))


def at_once(where: str, analytes: list[str]) -> None:
    command = [sys.executable, "-m", "tests.scale.apart", where]
    begun = [subprocess.Popen([*command, one], stdout=subprocess.PIPE, encoding="utf-8") for one in analytes]
    told = [json.loads(one.communicate()[0]) for one in begun]
    start = min(one["from"] for one in told)
    for one in told:
        times = ", ".join(f"{name} {one[name] - start:.1f} s" for name in ("from", "gathered", "to"))
        print(
            f"{one['analyte']}: {one['units']} units, {times}, processor {one['processor_s']:.1f} s, kept {one['kept']}"
        )


if __name__ == "__main__":
    if len(sys.argv) == 3:
        fit(*sys.argv[1:])
    else:
        for pair in ([sys.argv[2], sys.argv[3]], [sys.argv[2], sys.argv[2]]):
            at_once(sys.argv[1], pair)
