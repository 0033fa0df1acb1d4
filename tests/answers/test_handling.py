"""How a calibration's points were had, on the last line of its note: read back as written, whatever stands there."""

from __future__ import annotations

import pytest

from electrolog.answers.handling import MARK, Handling, amended, changes, split, with_handling
from electrolog.errors import InputError

SIGNAL = {"file": "run [1].npy", "settings": {"plateau": [0.5, 0.95]}, "warnings": ["a gap"]}
NOTES = [None, "tip clean", "two\nlines", "handling: by hand\nnot the last line"]


@pytest.mark.parametrize("note", NOTES)
@pytest.mark.parametrize(
    "handling",
    [Handling("1/x"), Handling("0.2nA+3%", True), Handling(signal=SIGNAL), Handling("replicates", True, SIGNAL)],
)
def test_what_is_kept_is_read_back(note: str | None, handling: Handling) -> None:
    assert split(with_handling(note, handling)) == (note, handling)


@pytest.mark.parametrize("note", NOTES)
def test_the_usual_way_leaves_no_trace(note: str | None) -> None:
    assert with_handling(note, Handling()) == note
    assert split(note) == (note, Handling())


@pytest.mark.parametrize(
    "line",
    ["", "no json", "[]", "3", "null", '{"weights": 3}', '{"weights": "heavy"}', '{"signal": ["x"]}', "[" * 100_000],
)
def test_a_line_that_cant_be_read_stays_a_persons_and_is_said(line: str) -> None:
    note = f"tip clean\n{MARK}{line}"
    text, handling = split(note)
    assert text == note
    assert handling.unreadable
    assert handling.to_dict() == {}


def test_a_new_note_leaves_the_handling_and_weights_have_their_own_name() -> None:
    note = with_handling("old", Handling("1/x", signal=SIGNAL))
    assert split(amended(note, {"note": "new"})["note"]) == ("new", Handling("1/x", signal=SIGNAL))
    assert split(amended(note, {"note": ""})["note"]) == (None, Handling("1/x", signal=SIGNAL))
    assert split(amended(note, {"weights": "1/x2"})["note"]) == ("old", Handling("1/x2", signal=SIGNAL))
    assert amended(note, {"rig": "rig-2"}) == {"rig": "rig-2"}
    assert amended(with_handling("old", Handling("1/x")), {"weights": ""}) == {"note": "old"}
    with pytest.raises(InputError, match="accepted: yes, no"):
        amended(note, {"through_zero": "perhaps"})


def test_changes_are_named_as_a_person_names_them() -> None:
    before, after = with_handling("old", Handling("1/x")), with_handling("new", Handling("1/x", True))
    assert changes(before, after) == {"note": ("old", "new"), "through_zero": ("no", "yes")}
    assert changes(None, None) == {}
