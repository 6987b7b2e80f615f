"""Intake: from the plant's own files to valid rows and rejects. It neither stores nor judges them."""

from __future__ import annotations

from agewatch.intake.feeds import SourceRead, read_feed
from agewatch.intake.rows import Parsed, parse_rows

__all__ = ["Parsed", "SourceRead", "parse_rows", "read_feed"]
