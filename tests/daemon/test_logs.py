"""The form of the log."""

from __future__ import annotations

import json
import logging
import sys

import pytest

from agewatch.daemon.logs import JsonLine, TextLine


def record(message: str, *, broken: bool = False) -> logging.LogRecord:
    """A record with hostile text, and an error if it is to have one."""
    trouble = None
    if broken:
        try:
            raise ValueError("no \x1b[2J here")
        except ValueError:
            trouble = sys.exc_info()
    return logging.LogRecord("agewatch.daemon", logging.ERROR, __file__, 1, "%s", (message,), trouble)


@pytest.mark.parametrize("form", [TextLine(True), TextLine(False), JsonLine(True), JsonLine(False)])
def test_no_text_steers_a_terminal(form: logging.Formatter) -> None:
    """Whatever a message or an error holds, only printable characters and line ends come out."""
    line = form.format(record("coil \x1b[31m\x9b\u202e\r\nERROR forged", broken=True))
    assert line.replace("\n", "").isprintable()
    assert "\u202e" not in line


def test_message_stays_on_its_line() -> None:
    """A line end inside a message is spelled out, so that no event can be forged."""
    assert TextLine(False).format(record("a\nERROR b")) == "ERROR a\\x0aERROR b"


def test_json_line() -> None:
    """JSON has time, level, logger and message, and the traceback only when it is asked for."""
    plain = json.loads(JsonLine(False).format(record("the share is gone", broken=True)))
    assert plain.pop("at").endswith("Z")
    assert plain == {"level": "error", "logger": "agewatch.daemon", "said": "the share is gone"}
    assert "ValueError" in json.loads(JsonLine(True).format(record("", broken=True)))["trace"]
