"""Reading settings from their TOML files: includes, one tree out of several files, and every fault as one line."""

from __future__ import annotations

import hashlib
import os
import re
import tomllib
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeGuard

from pydantic import ValidationError

from agewatch.errors import SettingsError
from agewatch.plant.contradictions import Key
from agewatch.plant.setting_faults import Fault, dotted, faults
from agewatch.plant.settings import Settings

_SYNTAX = re.compile(r"(?P<what>.*) \(at (?P<where>.*)\)", re.DOTALL)


@dataclass(frozen=True, slots=True)
class LoadedSettings:
    """Settings, and where they came from."""

    settings: Settings
    folder: Path
    """Of the main file: relative paths in the settings start here."""
    digest: str
    """SHA-256 (hex) of the settings; an assessment names it."""
    files: tuple[Path, ...]
    """The main file first, then what it includes, in the order of reading."""


def load_settings(path: Path) -> LoadedSettings:
    """The settings in `path` and all that it includes. Raises SettingsError with every fault found."""
    gathered = _Gathered()
    gathered.take(path, included_by=())
    problems = gathered.problems
    try:
        settings = Settings.model_validate(gathered.tree)
    except ValidationError as fault:
        problems = problems + gathered.lines(faults(fault, whole=gathered.whole))
    if problems:
        raise SettingsError(problems)
    # The order of the keys counts: a grade's main channel is the one listed first.
    digest = hashlib.sha256(settings.model_dump_json().encode()).hexdigest()
    return LoadedSettings(settings, path.absolute().parent, digest, tuple(gathered.files))


@dataclass(slots=True)
class _Gathered:
    """One tree out of several files, with the file that each key came from."""

    tree: dict[str, Any] = field(default_factory=dict)
    origin: dict[Key, tuple[Path, Key]] = field(default_factory=dict)
    """Key in the tree -> its file, and its key there (an array's places count from its own file's first)."""
    files: list[Path] = field(default_factory=list)
    problems: list[str] = field(default_factory=list)
    whole: bool = True
    """Every file could be read."""

    def take(self, path: Path, included_by: tuple[Path, ...]) -> None:
        """Add a file and what it includes; what is wrong goes to `problems`."""
        try:
            content = tomllib.loads(path.read_bytes().decode("utf-8-sig"))
        except (OSError, ValueError, RecursionError) as fault:
            self.problems.append(_unreadable(path, fault, included_by))
            self.whole = False
            return
        self.files.append(path)
        includes = content.pop("include", [])
        if not isinstance(includes, list) or not all(isinstance(name, str) for name in includes):
            self.problems.append(f'{path}: include: allowed is a list of files in quotes: ["grades.toml"]')
            includes = []
        self._merge(self.tree, content, (), (), path)
        for name in includes:
            self._include(Path(os.path.normpath(path.parent / name)), (*included_by, path))

    def _include(self, path: Path, included_by: tuple[Path, ...]) -> None:
        real = path.resolve()
        if real in (file.resolve() for file in included_by):
            circle = " includes ".join(file.name for file in (*included_by, path))
            self.problems.append(f"{included_by[-1]}: include: {circle}, a circle; take one of them out")
        elif real in (file.resolve() for file in self.files):
            self.problems.append(f"{included_by[-1]}: include: {path} is included already; name it once")
        else:
            self.take(path, included_by)

    def _merge(self, tree: dict[str, Any], content: dict[str, Any], at: Key, there: Key, path: Path) -> None:
        for name, value in content.items():
            key, own = (*at, name), (*there, name)
            present: object = tree.get(name)
            if name not in tree:
                tree[name] = value
                self._note(value, key, own, path)
            elif isinstance(present, dict) and isinstance(value, dict):
                self._merge(present, value, key, own, path)
            elif _is_array_of_tables(present) and _is_array_of_tables(value):
                for place, table in enumerate(value):
                    self._note(table, (*key, len(present)), (*own, place), path)
                    present.append(table)
            else:
                first = self.origin[key][0]
                self.problems.append(f"{path}: {dotted(own)}: {first} gives it already; give it once")

    def _note(self, value: object, key: Key, own: Key, path: Path) -> None:
        self.origin[key] = (path, own)
        if isinstance(value, dict):
            for name, inner in value.items():
                self._note(inner, (*key, name), (*own, name), path)
        elif isinstance(value, list):
            for place, inner in enumerate(value):
                self._note(inner, (*key, place), (*own, place), path)

    def lines(self, found: list[Fault]) -> list[str]:
        """One line for each fault, in the order in which the files give the keys."""
        order = {key: place for place, key in enumerate(self.origin)}
        placed = []
        for fault in found:
            known = fault.key
            while known and known not in self.origin:
                known = known[:-1]
            path, own = self.origin.get(known, (self.files[0], ()))
            key = (*own, *fault.key[len(known) :])
            placed.append((order.get(known, -1), f"{path}: {dotted(key)}: {fault.reason}"))
        return [line for _, line in sorted(placed, key=lambda pair: pair[0])]


def _is_array_of_tables(value: object) -> TypeGuard[list[dict[str, Any]]]:
    return isinstance(value, list) and bool(value) and all(isinstance(item, dict) for item in value)


def _unreadable(
    path: Path, fault: OSError | ValueError | RecursionError, included_by: tuple[Path, ...]
) -> str:
    if isinstance(fault, UnicodeDecodeError):
        return f"{path}: byte {fault.start + 1} is not UTF-8; save the file as UTF-8"
    if isinstance(fault, tomllib.TOMLDecodeError) and (match := _SYNTAX.fullmatch(str(fault))):
        return f"{path}: {match['where']}: {match['what']} (TOML syntax); mend the line"
    if isinstance(fault, OSError):
        if included_by:
            return f"{included_by[-1]}: include: {path}: {fault.strerror}; name a file relative to {included_by[-1]}"
        return f"{path}: {fault.strerror}; name the settings file with --config FILE or in AGEWATCH_CONFIG"
    return f"{path}: {fault or 'nested too deeply'} (TOML syntax); mend it"
