"""Where the signing secret of an endpoint is found, and how its absence is told."""

from __future__ import annotations

from pathlib import Path

import pytest

from agewatch.errors import SettingsError
from agewatch.messages import signing_secret
from agewatch.plant.settings import Endpoint
from tests.messages.samples import SECRET

BY_ENVIRONMENT = Endpoint(name="logistics", url="https://receiver.example/in", secret_env="AW_SECRET")
BY_FILE = Endpoint(name="logistics", url="https://receiver.example/in", secret_file="key/logistics")


def test_the_secret_comes_from_the_environment(tmp_path: Path) -> None:
    """secret_env names the variable; blanks around the secret do not matter."""
    assert signing_secret(BY_ENVIRONMENT, tmp_path, {"AW_SECRET": f" {SECRET}\n"}) == SECRET


def test_the_secret_comes_from_a_file_beside_the_settings(tmp_path: Path) -> None:
    """A relative secret_file is looked up in the settings' folder; its last line break does not matter."""
    (tmp_path / "key").mkdir()
    (tmp_path / "key" / "logistics").write_text(SECRET + "\n")
    assert signing_secret(BY_FILE, tmp_path, {}) == SECRET


def test_a_missing_variable_is_named(tmp_path: Path) -> None:
    """The error says which endpoint and which variable."""
    with pytest.raises(
        SettingsError, match="endpoint logistics: secret_env names AW_SECRET, which is not in"
    ):
        signing_secret(BY_ENVIRONMENT, tmp_path, {})


@pytest.mark.parametrize(
    ("content", "reason"), [(None, "No such file or directory"), (b"\xff\xfe", "it is not plain text")]
)
def test_an_unreadable_file_is_named(tmp_path: Path, content: bytes | None, reason: str) -> None:
    """The error says which endpoint, which file, and why it cannot be used."""
    (tmp_path / "key").mkdir()
    if content is not None:
        (tmp_path / "key" / "logistics").write_bytes(content)
    with pytest.raises(SettingsError, match="endpoint logistics: secret_file") as refusal:
        signing_secret(BY_FILE, tmp_path, {})
    assert f"{tmp_path}/key/logistics: {reason}" in str(refusal.value)


def test_a_bad_secret_names_its_endpoint_and_is_not_shown(tmp_path: Path) -> None:
    """A secret of the wrong form is refused for its endpoint, without repeating it."""
    with pytest.raises(SettingsError, match="endpoint logistics: a signing secret is") as refusal:
        signing_secret(BY_ENVIRONMENT, tmp_path, {"AW_SECRET": "hunter2"})
    assert "hunter2" not in str(refusal.value)
