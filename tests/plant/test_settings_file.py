"""Settings from files, and what is said of their faults."""

from __future__ import annotations

from pathlib import Path

import pytest

from agewatch.errors import SettingsError
from agewatch.plant.settings_file import load_settings

PLANT = """\
[site]
name = "Works"
[location.BAY]
sensors = ["T1"]
[grade.DC04]
rp02_mpa = 175.0
rm_mpa = 300.0
n_value = 0.21
[grade.DC04.channel.carbon]
tau_days = 300.0
"""


def problems(folder: Path, text: str, **others: str) -> list[str]:
    for name, content in others.items():
        (folder / f"{name}.toml").write_text(content, encoding="utf-8")
    (folder / "plant.toml").write_text(text, encoding="utf-8")
    with pytest.raises(SettingsError) as told:
        load_settings(folder / "plant.toml")
    return told.value.problems


def test_a_sound_file_is_read(tmp_path: Path) -> None:
    """Settings, their folder and a digest that changes with them."""
    (tmp_path / "plant.toml").write_text(PLANT, encoding="utf-8")
    one = load_settings(tmp_path / "plant.toml")
    (tmp_path / "plant.toml").write_text(PLANT.replace("300.0\n", "301.0\n"), encoding="utf-8")
    two = load_settings(tmp_path / "plant.toml")
    assert one.settings.site.name == "Works"
    assert one.folder == tmp_path
    assert one.digest != two.digest


@pytest.mark.parametrize(
    ("fault", "words"),
    [
        (PLANT + '[part.outer]\nype_limit_pc = 0.2\n', ["part.outer.ype_limit_pc", "ype_limit_pct"]),
        (PLANT + '[[feed]]\ntable = "coil"\npath = "x.csv"\n', ["feed", "coils"]),
        (PLANT + '[alarm]\noff_delay = "soon"\n', ["alarm.off_delay", "5 min"]),
        (PLANT.replace("175.0", "-1.0"), ["grade.DC04.rp02_mpa", "0"]),
        (PLANT.replace('name = "Works"', ""), ["site.name"]),
        (PLANT.replace("tau_days = 300.0", ""), ["grade.DC04.channel.carbon", "tau_days"]),
    ],
)  # fmt: skip
def test_a_typo_is_told_with_file_key_and_what_is_allowed(
    tmp_path: Path, fault: str, words: list[str]
) -> None:
    """One line for each fault."""
    (line,) = problems(tmp_path, fault)
    assert "plant.toml" in line
    for word in words:
        assert word in line


def test_all_faults_come_at_once(tmp_path: Path) -> None:
    """Nobody mends them one by one."""
    assert len(problems(tmp_path, PLANT + "[part.a]\nlimit = 1\n[outlook]\nhorizon_days = -3\n")) == 2


def test_an_include_is_read_and_its_faults_name_it(tmp_path: Path) -> None:
    """The file at fault is the one that is named."""
    (line,) = problems(tmp_path, 'include = ["parts.toml"]\n' + PLANT, parts="[part.outer]\nexposd = true\n")
    assert "parts.toml" in line
    assert "exposed" in line


def test_a_key_given_twice_is_refused(tmp_path: Path) -> None:
    """Later files win nothing silently."""
    twice = problems(tmp_path, 'include = ["more.toml"]\n' + PLANT, more='[site]\nname = "Other"\n')
    assert any("site.name" in line for line in twice)


def test_broken_toml_and_missing_files_are_told(tmp_path: Path) -> None:
    """With the place in the file, or the file that is not there."""
    (broken,) = problems(tmp_path, "[site\n")
    assert "plant.toml" in broken
    (missing,) = problems(tmp_path, 'include = ["none.toml"]\n' + PLANT)
    assert "none.toml" in missing
    with pytest.raises(SettingsError):
        load_settings(tmp_path / "absent.toml")
