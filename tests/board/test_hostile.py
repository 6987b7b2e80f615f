"""Names that try to act: on every screen they are text, and every line keeps its width."""

from __future__ import annotations

import unicodedata
from dataclasses import replace

from rich.cells import cell_len
from textual.pilot import Pilot

from agewatch.alarms import AlarmKind, Priority
from agewatch.board.app import BoardApp
from agewatch.plant.assessment import Verdict
from tests.board.driving import drive, listed, press, said, screen_text, settled
from tests.board.plant import alarm, board, coil, plant

NAMES = (
    "[red]C1[/red]",
    "[@click=app.quit]C2",
    "C3\x1b[2J\x1b]0;gone\x07",
    "C4\x9b31m\x85\x00",
    "C5\u202e0001\u2066",
    "C6\u200b\u200d\ufeff\u00ad",
    "שלום-7",
    "鋼卷鋼卷鋼卷鋼卷鋼卷鋼卷鋼卷-8",
    "C9" + "\u0301\u0335\u20dd" * 20,
    "C10\nsecond line\r\tand more",
    "\ud800C11",
    "\u200b",
    "x" * 5000,
    "👩‍👩‍👧‍👦❤️-13",
)


def _assert_inert(app: BoardApp, size: tuple[int, int]) -> None:
    lines = screen_text(app).split("\n")
    assert len(lines) == size[1]
    for line in lines:
        assert not {unicodedata.category(character) for character in line} & {"Cc", "Cf", "Cs", "Zl", "Zp"}
        assert cell_len(line) == size[0]


def test_hostile_names_are_text_on_every_screen() -> None:
    """As coil, grade, part, place, reason, alarm, in words, charts, questions and sentences told in passing."""
    verdicts = [Verdict.PULL, Verdict.UNASSESSED]
    coils = [
        replace(
            coil(name, verdicts[place % 2], returns_d=place, grade=name, part=name, location=name),
            reason=f"grade {name} is not in the settings",
        )
        for place, name in enumerate(NAMES)
    ]
    alarms = [
        replace(
            alarm(AlarmKind.UNASSESSABLE_COIL, name, Priority.HIGH, location=name), detail={"reason": name}
        )
        for name in NAMES
    ]
    data = plant(coils, alarms)
    app = board(data)
    size = (120, 28)

    async def look(pilot: Pilot[None]) -> None:
        assert "[red]C1[/red]" in screen_text(app)
        for _ in range(0, len(NAMES), 2):
            _assert_inert(app, size)
            await press(pilot, "down", "down")
        data.refusal = f"refused: {NAMES[2]} {NAMES[0]}"
        await press(pilot, "a")
        assert said(app).startswith("Not acknowledged: refused: C3[2J]0;gone")
        _assert_inert(app, size)
        data.unreadable = NAMES[2]
        app.read()
        await settled(pilot)
        await press(pilot, "2", "down", "down")
        _assert_inert(app, size)
        await press(pilot, "o")
        _assert_inert(app, size)
        await press(pilot, "escape", "1", "g")
        _assert_inert(app, size)

    drive(app, look, size)


def test_a_coil_is_acknowledged_under_its_own_name_not_the_shown_one() -> None:
    """What is made inert is the picture; the daemon hears the name as the plant has it."""
    name = "C3\x1b[2J"
    data = plant([coil(name, Verdict.PULL)], [alarm(AlarmKind.RETURN_BEFORE_PRESS, name, Priority.HIGH)])
    app = board(data)

    async def acknowledge(pilot: Pilot[None]) -> None:
        await press(pilot, "a")
        assert not data.now.alarms[0].needs_acknowledging
        assert listed(app).table.chosen == name

    drive(app, acknowledge, (80, 24))


def test_what_is_typed_or_pasted_cannot_act_either() -> None:
    """A pasted escape sequence is searched for, not obeyed."""
    app = board(plant())

    async def paste(pilot: Pilot[None]) -> None:
        await press(pilot, "f")
        listed(app).find_bar.set_words("\x1b[2J[red]\u202e")
        await settled(pilot)
        assert "No coil has all these words" in screen_text(app)
        _assert_inert(app, (80, 24))

    drive(app, paste, (80, 24))
