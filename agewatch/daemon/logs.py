"""The daemon's log: one line for each event on stderr, as text or JSON, which no text from outside can break."""

from __future__ import annotations

import json
import logging
import sys
from typing import Literal

from agewatch.clock import rfc3339
from agewatch.messages.inert import inert

LINE_LIMIT = 4000
_TRACE_LIMIT = 20_000

LogForm = Literal["text", "json"]


def set_up_log(form: LogForm, *, debug: bool) -> None:
    """Send what the daemon has to say to stderr. `debug` adds tracebacks and what helps in a search."""
    handler = logging.StreamHandler(sys.stderr)
    handler.setFormatter(JsonLine(debug) if form == "json" else TextLine(debug))
    logging.basicConfig(level=logging.DEBUG if debug else logging.INFO, handlers=[handler], force=True)
    for library in ("apscheduler", "alembic", "urllib3", "tzlocal"):
        logging.getLogger(library).setLevel(logging.ERROR)


class TextLine(logging.Formatter):
    """`INFO message`: the journal adds the time."""

    def __init__(self, traces: bool) -> None:
        super().__init__()
        self._traces = traces

    def format(self, record: logging.LogRecord) -> str:
        line = f"{record.levelname} {inert(record.getMessage(), LINE_LIMIT)}"
        if self._traces and record.exc_info:
            line += "\n" + "\n".join(
                "    " + inert(part, LINE_LIMIT)
                for part in self.formatException(record.exc_info).splitlines()
            )
        return line


class JsonLine(logging.Formatter):
    """One JSON object with `at`, `level`, `logger`, `said` and, where there is one, `trace`."""

    def __init__(self, traces: bool) -> None:
        super().__init__()
        self._traces = traces

    def format(self, record: logging.LogRecord) -> str:
        line = {
            "at": rfc3339(record.created),
            "level": record.levelname.lower(),
            "logger": record.name,
            "said": inert(record.getMessage(), LINE_LIMIT),
        }
        if self._traces and record.exc_info:
            line["trace"] = self.formatException(record.exc_info)[-_TRACE_LIMIT:]
        return json.dumps(line, ensure_ascii=True)
