"""Without colour, and in both kinds of light, the board says the same."""

from __future__ import annotations

import re

import pytest
from rich.color import Color, ColorSystem
from textual.pilot import Pilot

from agewatch.board.app import BoardApp
from agewatch.board.look import TONES
from agewatch.board.palette import DAY, NIGHT
from tests.board.driving import drive, press, screen_text
from tests.board.plant import board, plant


def _colours(app: BoardApp) -> list[Color]:
    """Every colour of the screen as it is sent to the terminal."""
    strips = [strip.apply_filter(each, app.screen.background_colors[1])
              for strip in app.screen._compositor.render_strips() for each in app.get_line_filters()]  # fmt: skip
    styles = [segment.style for strip in strips for segment in strip if segment.style is not None]
    return [colour for style in styles for colour in (style.color, style.bgcolor) if colour is not None]


def test_no_colour_means_grey_and_every_mark_is_still_there(monkeypatch: pytest.MonkeyPatch) -> None:
    """With NO_COLOR set: letters, the pointer of the chosen line, the band's edges, the limit's label."""
    monkeypatch.setenv("NO_COLOR", "1")
    app = board(plant())

    async def look(pilot: Pilot[None]) -> None:
        await press(pilot, "down")
        for colour in _colours(app):
            red, green, blue = colour.get_truecolor()
            assert max(red, green, blue) - min(red, green, blue) <= 2
        text = screen_text(app)
        assert "▸ P pull" in text
        assert "limit 0.2 %" in text
        assert re.search("[⠁-⣿] [⠁-⣿]", text)

    drive(app, look)


@pytest.mark.parametrize("tone", ["hold", "pull", "watch", "unassessed", "limit", "quiet", "strong", "mark"])
@pytest.mark.parametrize("theme", [NIGHT, DAY], ids=lambda theme: theme.name)
def test_every_tone_can_be_read_by_night_and_by_day(theme: object, tone: str) -> None:
    """At least 4.5 to 1 between text and ground (3 to 1 for what is quiet): the contrast of WCAG 2.1, AA."""
    least = 3.0 if tone == "quiet" else 4.5
    for ground in ("$background", "$surface", "$chosen", "$band"):
        on, text = _pair(theme, TONES[tone], ground)
        assert _contrast(on, text) >= least, (tone, ground)


@pytest.mark.parametrize("theme", [NIGHT, DAY], ids=lambda theme: theme.name)
def test_sixteen_colours_keep_the_verdicts_apart(theme: object) -> None:
    """Brought down to a plain terminal's colours, the abnormal ones are four different ones, and none is grey."""
    names = ("act-now", "act-soon", "look", "unknown")
    plain = [
        Color.parse(theme.variables[name]).downgrade(ColorSystem.STANDARD).number  # type: ignore[attr-defined]
        for name in names
    ]
    assert len(set(plain)) == len(names)
    assert not set(plain) & {0, 7, 8, 15}


def _pair(theme: object, style: str, ground: str) -> tuple[str, str]:
    variables = {
        "foreground": theme.foreground, "background": theme.background,  # type: ignore[attr-defined]
        "surface": theme.surface, **theme.variables,  # type: ignore[attr-defined]
    }  # fmt: skip
    words = style.split()
    on = words[words.index("on") + 1] if "on" in words else ground
    text = next((word for word in words if word.startswith("$") and word != on), "$foreground")
    return variables[on[1:]], variables[text[1:]]


def _contrast(one: str, other: str) -> float:
    light, dark = sorted((_luminance(one), _luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def _luminance(colour: str) -> float:
    """Relative luminance of sRGB, as WCAG 2.1 defines it (from memory of its formula)."""
    parts = [int(colour[at : at + 2], 16) / 255 for at in (1, 3, 5)]
    linear = [part / 12.92 if part <= 0.03928 else ((part + 0.055) / 1.055) ** 2.4 for part in parts]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
