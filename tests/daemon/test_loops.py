"""A loop: the place where errors stop, and what it shows for itself."""

from __future__ import annotations

from agewatch.daemon.loops import Loop


def _fail() -> None:
    raise ValueError("the disk is on holiday")


def test_error_stops_at_the_loop() -> None:
    """An error of the work is told, counted and shown, and does not get out."""
    told: list[tuple[str, Exception]] = []
    loop = Loop("read", 10.0, lambda name, error: told.append((name, error)))
    assert not loop.turn(_fail)
    progress = loop.progress()
    assert [(name, str(error)) for name, error in told] == [("read", "the disk is on holiday")]
    assert (progress.turns, progress.failures, progress.last_error) == (1, 1, "the disk is on holiday")


def test_a_good_turn_ends_the_trouble() -> None:
    """After a turn that goes well no error is shown, while the count of failures stays."""
    loop = Loop("read", 10.0, lambda name, error: None)
    loop.turn(_fail)
    assert loop.turn(lambda: None)
    progress = loop.progress()
    assert (progress.turns, progress.failures, progress.last_error) == (2, 1, "")


def test_stuck_until_a_sign_of_life() -> None:
    """A loop without a sign of life for longer than it is allowed is stuck; a sign ends that."""
    loop = Loop("deliver", 0.0, lambda name, error: None)
    assert loop.progress().stuck
    patient = Loop("deliver", 60.0, lambda name, error: None)
    patient.beat()
    assert not patient.progress().stuck
