"""A loop: the place where errors stop, and what it shows for itself."""

from __future__ import annotations

from agewatch.daemon.loops import Loop


def _fail() -> None:
    raise ValueError("the disk is on holiday")


def test_error_stops_at_the_loop() -> None:
    """An error of the work is told, counted and shown, and does not get out."""
    told: list[tuple[str, Exception, bool]] = []
    loop = Loop("read", 10.0, lambda name, error, again: told.append((name, error, again)))
    assert not loop.turn(_fail)
    progress = loop.progress()
    assert [(name, str(error), again) for name, error, again in told] == [
        ("read", "the disk is on holiday", False)
    ]
    assert (progress.turns, progress.failures, progress.last_error) == (
        1,
        1,
        "ValueError: the disk is on holiday",
    )


def test_same_error_again_is_told_as_such() -> None:
    """An error is told as a repetition while the turn before ended alike, and as news after a good turn."""
    told: list[bool] = []
    loop = Loop("read", 10.0, lambda name, error, again: told.append(again))
    for work in (_fail, _fail, _fail, lambda: None, _fail, lambda: told.remove(7), _fail):
        loop.turn(work)
    assert told == [False, True, True, False, False, False]


def test_a_good_turn_ends_the_trouble() -> None:
    """After a turn that goes well no error is shown, while the count of failures stays."""
    loop = Loop("read", 10.0, lambda name, error, again: None)
    loop.turn(_fail)
    assert loop.turn(lambda: None)
    progress = loop.progress()
    assert (progress.turns, progress.failures, progress.last_error) == (2, 1, "")


def test_stuck_until_a_sign_of_life() -> None:
    """A loop without a sign of life for longer than it is allowed is stuck; a sign ends that."""
    loop = Loop("deliver", 0.0, lambda name, error, again: None)
    assert loop.progress().stuck
    patient = Loop("deliver", 60.0, lambda name, error, again: None)
    patient.beat()
    assert not patient.progress().stuck
