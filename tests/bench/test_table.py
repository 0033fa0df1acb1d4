"""The table of the benchmark itself: turns taken, ratios formed, verdicts in words. Nothing is timed here."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tests.bench import __main__ as bench
from tests.bench import table
from tests.bench.line import AT_LEAST, AT_MOST, Aim, Family, Line, left_out, ratio
from tests.bench.timing import Taken, by_turns, python

PEER = Taken((1.0, 9.0, 2.0))


def test_works_take_turns_and_the_first_round_is_not_counted() -> None:
    order: list[str] = []

    def work(name: str, seconds: float) -> float:
        order.append(name)
        return seconds * len(order)

    taken = by_turns({"ours": lambda: work("ours", 1.0), "peer": lambda: work("peer", 10.0)}, rounds=2)
    assert order == ["ours", "peer"] * 3
    assert taken["ours"].seconds == (3.0, 5.0)
    assert taken["peer"].seconds == (40.0, 60.0)


def test_a_work_that_does_not_time_itself_is_timed() -> None:
    (taken,) = by_turns({"ours": lambda: sum(range(1000))}, rounds=3).values()
    assert len(taken.seconds) == len(taken.processor_s) == 3
    assert min(taken.seconds) > 0


def test_a_busy_machine_is_seen_through_by_processor_time() -> None:
    ours, peer = Taken((9.0,), (2.0,)), Taken((1.0,), (1.0,))
    assert ratio("work", "peer", ours, peer, 1.5).by_processor_time == 2.0
    assert ratio("work", "peer", ours, peer, 1.5, AT_LEAST).by_processor_time == 0.5
    assert ratio("work", "peer", Taken((9.0,), (0.0,)), peer, 1.5).by_processor_time is None


@pytest.mark.parametrize(
    ("sense", "limit", "value", "verdict"),
    [(AT_MOST, 1.5, 1.5, "met"), (AT_MOST, 1.4, 1.5, "not met"), (AT_LEAST, 0.6, 2 / 3, "met")],
)
def test_the_ratio_is_of_medians_and_its_verdict_a_word(sense: str, limit: float, value: float, verdict: str) -> None:
    line = ratio("work", "peer", Taken((3.0, 2.0, 100.0)), PEER, limit, sense)
    assert line.value == pytest.approx(value)
    assert line.verdict == verdict
    assert verdict in table.markdown([line])


def test_what_is_left_out_says_why() -> None:
    line = left_out("fit", "lme4", Aim(1), "R isn't there")
    assert line.verdict == "left out"
    assert "left out: R isn't there" in table.markdown([line])


def test_the_same_stands_in_the_file(tmp_path: Path) -> None:
    path = tmp_path / "build" / "bench.json"
    lines = [ratio("work", "peer", Taken((3.0,)), PEER, 1.4), Line("size", "", None, None, 4.2, Aim(5, "MB"))]
    table.write_json(path, {"python": "3"}, lines)
    first, second = json.loads(path.read_text(encoding="utf-8"))["lines"]
    assert first["ours_s"] == [3.0]
    assert first["peer_s"] == [1.0, 9.0, 2.0]
    assert (first["value"], first["verdict"]) == (1.5, "not met")
    assert (second["aim"], second["value"], second["verdict"]) == ("≤ 5 MB", 4.2, "met")


def test_a_failing_family_leaves_the_others_their_lines(capsys: pytest.CaptureFixture[str]) -> None:
    def fails() -> None:
        raise RuntimeError("no such lab")

    line = left_out("fit", "lme4", Aim(1), "R isn't there")
    lines, failed = bench._measured([Family("broken", fails), Family("whole", lambda: iter([line]))])  # type: ignore[arg-type, return-value]
    assert lines == [line]
    assert failed
    assert "broken could not be measured: RuntimeError: no such lab" in capsys.readouterr().out


def test_a_command_that_fails_is_no_measurement() -> None:
    with pytest.raises(RuntimeError, match="ended with 3"):
        python("-c", "raise SystemExit(3)")()


def test_an_unknown_family_is_refused(capsys: pytest.CaptureFixture[str]) -> None:
    assert bench.main(["nonsense"]) == 2
    assert "nothing is called nonsense" in capsys.readouterr().out
