"""Every error that AgeWatch raises on purpose. One tree:

    AgeWatchError                exit status
    ├── UsageError               2   the command line asks for something that cannot be
    ├── SettingsError            2   the settings are refused: file, key, what is allowed
    ├── FeedError                3   a source cannot be read at all (a bad row is no error: it is kept as a reject)
    ├── StoreError               3   the store cannot be opened, read or written
    └── ControlError             3   the running daemon cannot be reached, or refused the action

Each message is one line: what, where, and what to do about it.
"""

from __future__ import annotations


class AgeWatchError(Exception):
    """Base of all. `exit_status` is what the command line returns."""

    exit_status = 1


class UsageError(AgeWatchError):
    """The command line asks for something that cannot be."""

    exit_status = 2


class SettingsError(AgeWatchError):
    """The settings are refused; `problems` holds one line for each fault, in file order."""

    exit_status = 2

    def __init__(self, problems: list[str]) -> None:
        super().__init__("\n".join(problems))
        self.problems = problems


class FeedError(AgeWatchError):
    """A source cannot be read at all. It is left where it is, untouched."""

    exit_status = 3

    def __init__(self, feed: str, where: str, reason: str) -> None:
        super().__init__(f"feed {feed}: {where}: {reason}")
        self.feed = feed
        self.where = where
        self.reason = reason


class StoreError(AgeWatchError):
    """The store cannot be opened, read or written."""

    exit_status = 3


class ControlError(AgeWatchError):
    """The running daemon cannot be reached, or it refused the action."""

    exit_status = 3
