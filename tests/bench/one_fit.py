"""One cohort fit in a process of its own, for its time and its peak memory:  python -m tests.bench.one_fit 1000"""

from __future__ import annotations

import json
import sys
import time

from electrolog.fouling.cohort import fit_cohort
from tests.bench import labs
from tests.fouling.fleets.simulate import fleet

KILO = 1024
GIGABYTE = 1e9


def peak_gb() -> float | None:
    """The most memory that this process has held; None where the system doesn't say (Windows)."""
    try:
        import resource
    except ImportError:
        return None
    most = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return most / GIGABYTE * (1 if sys.platform == "darwin" else KILO)


def main(probes: int) -> None:
    events = fleet(labs.FAMILY, labs.SEED, probes).events
    before_gb = peak_gb()
    begun = time.perf_counter()
    fit = fit_cohort(events)
    seconds = time.perf_counter() - begun
    said = {"seconds": seconds, "peak_gb": peak_gb(), "before_gb": before_gb, "readings": fit.n_readings}
    print(json.dumps(said))


if __name__ == "__main__":
    main(int(sys.argv[1]))
