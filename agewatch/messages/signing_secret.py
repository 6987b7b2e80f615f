"""Where an endpoint's signing secret is kept: in the environment or in a file, never in the settings."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

from agewatch.errors import SettingsError
from agewatch.messages.signing import key_of

if TYPE_CHECKING:
    from agewatch.plant.settings import Endpoint


def signing_secret(endpoint: Endpoint, folder: Path, environment: Mapping[str, str]) -> str:
    """The secret of `endpoint`; a relative file is looked up in `folder`, that of the settings.

    Raises SettingsError that says where it was looked for, and never what was found there.
    """
    secret = _written(endpoint, folder, environment).strip()
    try:
        key_of(secret)
    except SettingsError as fault:
        raise SettingsError([f"endpoint {endpoint.name}: {problem}" for problem in fault.problems]) from None
    return secret


def _written(endpoint: Endpoint, folder: Path, environment: Mapping[str, str]) -> str:
    if endpoint.secret_env is not None:
        if endpoint.secret_env not in environment:
            raise SettingsError(
                [
                    f"endpoint {endpoint.name}: secret_env names {endpoint.secret_env}, which is not in the "
                    "environment; set it to the signing secret"
                ]
            )
        return environment[endpoint.secret_env]
    path = folder / str(endpoint.secret_file)
    try:
        return path.read_text(encoding="ascii")
    except (OSError, UnicodeDecodeError) as fault:
        reason = fault.strerror if isinstance(fault, OSError) else "it is not plain text"
        raise SettingsError(
            [f"endpoint {endpoint.name}: secret_file {path}: {reason}; put the signing secret there"]
        ) from None
