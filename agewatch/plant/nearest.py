"""What to say about a name that nobody knows: the nearest known one, and all that are allowed."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches


def unknown(name: str, allowed: Iterable[str], what: str) -> str:
    """For example: no column of coils is named "mas_kg" (did you mean "mass_kg"?); allowed are coil_id, ..."""
    names = list(allowed)
    return f'no {what} is named "{name}"{did_you_mean(name, names)}; allowed are {", ".join(names)}'


def did_you_mean(name: str, allowed: Iterable[str]) -> str:
    """The question after the nearest of the allowed names, or nothing where none is near."""
    folded = {candidate.casefold(): candidate for candidate in allowed}
    near = get_close_matches(name.casefold(), folded, n=1, cutoff=0.6)
    return f' (did you mean "{folded[near[0]]}"?)' if near else ""
