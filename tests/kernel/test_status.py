"""The status table is complete and each entry can stand in a cell's reason."""

import pytest

from moletally.kernel.status import STATUS, Status


def test_every_status_is_in_the_table() -> None:
    assert set(STATUS) == set(Status)
    assert len({text.name for text in STATUS.values()}) == len(STATUS)


@pytest.mark.parametrize("status", [s for s in Status if s != Status.OK])
def test_a_status_says_what_happened_and_what_to_do(status: Status) -> None:
    text = STATUS[status]
    assert text.sentence[0].isupper()
    assert text.sentence.endswith(".")
    assert text.remedy.endswith((".", "?"))
    assert "_" not in text.name


def test_a_runaway_defers_to_a_licensed_engineer() -> None:
    assert "licensed engineer" in STATUS[Status.BLOW_UP].remedy
