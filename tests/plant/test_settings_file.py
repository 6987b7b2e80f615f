"""Settings out of several files, their contradictions, and what is said of every fault."""

from __future__ import annotations

import json
import subprocess
import sys
from datetime import UTC, datetime
from pathlib import Path

import pytest

from agewatch.errors import SettingsError
from agewatch.messages.body import MessageType
from agewatch.plant.setting_values import MESSAGE_TYPES
from agewatch.plant.settings_file import LoadedSettings, load_settings

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


def load(folder: Path, text: str, **others: str) -> LoadedSettings:
    for name, content in {"plant": text, **others}.items():
        (folder / f"{name}.toml").write_text(content, encoding="utf-8")
    return load_settings(folder / "plant.toml")


def problems(folder: Path, text: str, **others: str) -> list[str]:
    """Every line, without the folder."""
    with pytest.raises(SettingsError) as told:
        load(folder, text, **others)
    assert all("\n" not in line for line in told.value.problems)
    return [line.replace(f"{folder}/", "") for line in told.value.problems]


def test_tables_and_arrays_come_together_from_several_files(tmp_path: Path) -> None:
    """A table may be spread, arrays of tables follow each other, includes nest and count from their own folder."""
    (tmp_path / "more").mkdir()
    loaded = load(
        tmp_path,
        'include = ["more/feeds.toml"]\n' + PLANT + '[[feed]]\ntable = "coils"\npath = "a.csv"\n',
        **{
            "more/feeds": 'include = ["parts.toml"]\n[[feed]]\ntable = "moves"\npath = "b.csv"\n',
            "more/parts": "[part.outer]\nexposed = true\n[location.BAY]\nlag_h = 20.0\n",
        },
    )
    settings = loaded.settings
    assert [feed.name for feed in settings.feed] == ["coils:a.csv", "moves:b.csv"]
    assert settings.part["outer"].exposed
    assert (settings.location["BAY"].sensors, settings.location["BAY"].lag_h) == (["T1"], 20.0)
    assert loaded.files == (
        tmp_path / "plant.toml", tmp_path / "more/feeds.toml", tmp_path / "more/parts.toml",
    )  # fmt: skip


def test_the_folder_is_that_of_the_main_file_as_it_was_named(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Absolute, so that a daemon may change its own."""
    load(tmp_path, PLANT)
    monkeypatch.chdir(tmp_path)
    assert load_settings(Path("plant.toml")).folder == tmp_path


def test_a_digest_tells_settings_apart_and_no_more(tmp_path: Path) -> None:
    """Comments and files do not count; values do, and so does the order of channels (the first is the main one)."""
    two = PLANT + "[grade.DC04.channel.nitrogen]\ntau_days = 100.0\n"
    turned = PLANT.replace("carbon]\ntau_days = 300.0", "nitrogen]\ntau_days = 100.0") + (
        "[grade.DC04.channel.carbon]\ntau_days = 300.0\n"
    )
    head, tail = PLANT.split("[grade", 1)
    one = load(tmp_path, PLANT).digest
    assert len(one) == 64
    assert load(tmp_path, "# a word\n" + PLANT).digest == one
    assert load(tmp_path, 'include = ["g.toml"]\n' + head, g="[grade" + tail).digest == one
    assert len({one, load(tmp_path, two).digest, load(tmp_path, turned).digest}) == 3


def test_settings_of_an_editor_with_a_byte_order_mark_are_read(tmp_path: Path) -> None:
    """And its line ends."""
    assert load(tmp_path, "\ufeff" + PLANT.replace("\n", "\r\n")).settings.site.name == "Works"


def test_every_fault_is_told_at_once_in_the_order_of_the_files(tmp_path: Path) -> None:
    """Each with the file that holds it, its key there, what is wrong and what is allowed."""
    text = (
        'include = ["grades.toml"]\n'
        + PLANT.split("[grade", 1)[0]
        + '[location."BAY 2"]\nsensors = "T2"\nsurface_w_m2k = -1\n'
        + (
            '[clock]\nkind = "repla"\n'
            '[[feed]]\ntable = "coils"\npath = "c.csv"\nevery = "5 minutes"\n'
            '[[feed]]\ntable = "lab"\npath = "l.csv"\nevry = "5 min"\n'
            "[outlook]\nhorizon_days = 5000\nmonthly_normals_c = [1.0]\n"
            "[daemon]\nhttp_port = 9.5\n"
        )
    )
    grades = (
        '[grade.DC04]\naging = "yes"\nrp02_mpa = "175"\nrm_mpa = nan\nn_value = 1\n'
        "[grade.DC04.channel.carbn]\ntau_days = 1\n[grade.DC04.channel.carbon]\n"
        '[[feed]]\ntable = "moves"\npath = ""\n'
    )
    assert problems(tmp_path, text, grades=grades) == [
        'plant.toml: location."BAY 2".sensors: "T2" will not do; allowed is a list in [ ]',
        'plant.toml: location."BAY 2".surface_w_m2k: -1 will not do; allowed is a number above 0',
        'plant.toml: clock.kind: "repla" will not do; allowed is "system" or "replay"',
        "plant.toml: feed[0].every ([[feed]] number 1): allowed is a number and a unit in quotes: "
        '"30 s", "5 min", "24 h" or "14 d"',
        'plant.toml: feed[1].evry ([[feed]] number 2): is no known key (did you mean "every"?); allowed are table, '
        "path, every, timezone, local_times, columns, ignore, empty, separator, decimal, encoding, time_format, "
        "stale_after",
        "plant.toml: outlook.horizon_days: 5000 will not do; allowed is a number above 0 and at most 1000",
        "plant.toml: outlook.monthly_normals_c: a list of 1 will not do; allowed is a list in [ ] of exactly 12",
        "plant.toml: daemon.http_port: 9.5 will not do; allowed is a whole number at least 0 and at most 65535",
        'grades.toml: grade.DC04.aging: "yes" will not do; allowed is true or false',
        'grades.toml: grade.DC04.rp02_mpa: "175" will not do; allowed is a number above 0',
        "grades.toml: grade.DC04.rm_mpa: nan will not do; allowed is a number above 0",
        "grades.toml: grade.DC04.n_value: 1 will not do; allowed is a number above 0 and below 1",
        'grades.toml: grade.DC04.channel.carbn: is no known key (did you mean "carbon"?); allowed are carbon, nitrogen',
        "grades.toml: grade.DC04.channel.carbon: give either tau_days or dislocation_density_per_m2, not both and not "
        "neither",
        'grades.toml: feed[0].path ([[feed]] number 1): "" will not do; allowed is text in quotes that is not empty',
    ]


@pytest.mark.parametrize(
    ("more", "line"),
    [
        ('[location.YARD]\nsensors = ["T2", "T1"]\n',
         "location.YARD.sensors[1]: sensor T1 already stands under location BAY; a sensor belongs to one location"),
        ('[[feed]]\ntable = "lab"\npath = "l"\n' * 2,
         "feed[1].path ([[feed]] number 2): another feed reads lab from l; give it once"),
        ('[[feed]]\ntable = "temperatures"\npath = "t"\ncolumns = { T11 = "Hall" }\n',
         'feed[0].columns.T11 ([[feed]] number 1): no location has a sensor T11 (did you mean "T1"?)'),
        ('[[feed]]\ntable = "temperatures"\npath = "t"\ncolumns = { T1 = "Hall", celsius = "C" }\n',
         "feed[0].columns.T1 ([[feed]] number 1): the file is either long (columns.celsius) or wide (a column for each "
         "sensor), not both"),
        ('[[feed]]\ntable = "moves"\npath = "m"\ncolumns = { coil = "NO" }\n',
         'feed[0].columns.coil ([[feed]] number 1): no column of moves is named "coil" (did you mean "coil_id"?); '
         "allowed are coil_id, at, location"),
        ('[[feed]]\ntable = "moves"\npath = "m"\ncolumns = { at = "T" }\nignore = ["T"]\n',
         "feed[0].columns.at ([[feed]] number 1): T also stands under ignore; a column is read or ignored"),
        ('[[endpoint]]\nname = "a"\nurl = "https://h/"\nsecret_env = "S"\n' * 2,
         "endpoint[1].name ([[endpoint]] number 2): another endpoint is named a; each needs its own name"),
        ("[outlook]\nhorizon_days = 10\npull_horizon_days = 11\n",
         "outlook.pull_horizon_days: allowed is at most horizon_days, 10"),
        ("[screening]\nlowest_c = 70\n", "screening.lowest_c: allowed is less than highest_c, 65"),
        ('[clock]\nkind = "replay"\n',
         'clock: a replay clock needs start = "2026-05-01T00:00:00Z" (any RFC 3339 time)'),
        ("[clock]\nrate = 600\n",
         'clock: start and rate belong to kind = "replay"; the system clock takes neither'),
        ("[grade.X]\naging = false\nrp02_mpa = 300\nrm_mpa = 300\nn_value = 0.2\n",
         "grade.X: rm_mpa must be above rp02_mpa"),
        ("[grade.X]\nrp02_mpa = 200\nrm_mpa = 300\nn_value = 0.2\n",
         "grade.X: an aging grade needs at least one channel, for example [grade.NAME.channel.carbon]"),
    ],
)  # fmt: skip
def test_what_cannot_hold_together_is_refused(tmp_path: Path, more: str, line: str) -> None:
    """At the key that one would look at first."""
    assert problems(tmp_path, PLANT + more) == [f"plant.toml: {line}"]


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ('timezone = "Europe/Prag"', 'no time zone is named "Europe/Prag"'),
        ("timezone = 1", "allowed is the name of a time zone"),
        ('encoding = "utf8mb4"', 'no text encoding is named "utf8mb4"'),
        ('encoding = "base64"', "no text encoding"),
        ('time_format = "%Y-%m"', "it leaves the day open"),
        ('time_format = "%Q"', "allowed is a strptime pattern"),
        ('time_format = "%d.%m.%Y %Z"', "%Z names no offset for sure"),
        ("every = 5", "allowed is a number and a unit in quotes"),
        ('every = "0 s"', "allowed is more than 0 s"),
        ('every = "99999999 d"', "allowed is at most 100 years"),
        ('separator = "|"', 'allowed is "," or ";" or "\\t" or "auto"'),
        ('path = "a\\u0000b"', "holds a NUL"),
        ("columns = { at = 5 }", "5 will not do; allowed is text in quotes"),
        ("columns = 5", "5 will not do; allowed is a table"),
    ],
)
def test_the_dialect_of_a_feed_is_checked(tmp_path: Path, keys: str, words: str) -> None:
    """Before any file is read by it."""
    path = "" if keys.startswith("path") else 'path = "m"\n'
    (line,) = problems(tmp_path, f'{PLANT}[[feed]]\ntable = "moves"\n{path}{keys}\n')
    assert line.startswith("plant.toml: feed[0].")
    assert words in line


@pytest.mark.parametrize(
    ("keys", "words"),
    [
        ('url = "http://h/"\nsecret_env = "S"', "allowed is https://HOST/PATH (http:// for loopback only)"),
        ('url = "ftp://h/"\nsecret_env = "S"', "allowed is https://HOST/PATH"),
        ('url = "https:///x"\nsecret_env = "S"', "allowed is https://HOST/PATH"),
        ('url = "https://h/"', "by either secret_env or secret_file"),
        ('url = "https://h/"\nsecret_env = "S"\nsecret_file = "s"', "by either secret_env or secret_file"),
        ('url = "https://h/"\nsecret_env = "S"\ntypes = ["agewatch.pull.request"]',
         'endpoint[0].types[0] ([[endpoint]] number 1): no message type is named "agewatch.pull.request" (did you mean '
         '"agewatch.pull.requested"?)'),
        ('url = "https://h/"\nsecret_env = "S"\nattempts = 0', "0 will not do; allowed is a whole number at least 1"),
    ],
)  # fmt: skip
def test_an_endpoint_is_checked(tmp_path: Path, keys: str, words: str) -> None:
    """Where it is, that it can sign, and that what it takes is ever sent."""
    (line,) = problems(tmp_path, f'{PLANT}[[endpoint]]\nname = "a"\n{keys}\n')
    assert words in line


@pytest.mark.parametrize(
    "text",
    [
        '[[endpoint]]\nname = "a"\nurl = "https://u:hunter2@h/"\nsecret_env = "S"\n',
        '[[endpoint]]\nname = "a"\nurl = "https://h/"\nsecret = "hunter2"\n',
        '[store]\nurl = "postgresql+psycopg://agewatch:hunter2@h/plant"\n',
        '[store]\nurl = "mysql://agewatch:hunter2@h/plant"\n',
    ],
)
def test_a_secret_in_the_settings_is_refused_and_not_repeated(tmp_path: Path, text: str) -> None:
    """What is told of a fault may end in a log."""
    lines = problems(tmp_path, PLANT + text)
    assert lines
    assert "hunter2" not in "".join(lines)


def test_message_types_of_the_settings_are_those_that_are_sent() -> None:
    """An endpoint can ask for each, and for nothing else."""
    assert set(MESSAGE_TYPES) == set(MessageType)


def test_a_key_given_twice_is_told_beside_the_other_faults(tmp_path: Path) -> None:
    """With both files; nothing is overruled silently."""
    lines = problems(
        tmp_path,
        'include = ["more.toml"]\n' + PLANT,
        more='[site]\nname = "Other"\n[location.BAY]\nlag = 1\n',
    )
    assert lines[0] == "more.toml: site.name: plant.toml gives it already; give it once"
    assert lines[1].startswith("more.toml: location.BAY.lag: is no known key")
    assert len(lines) == 2


def test_a_plain_list_is_not_put_together_from_two_files(tmp_path: Path) -> None:
    """Nor is a table where the other file has a value."""
    lines = problems(
        tmp_path,
        'include = ["a.toml"]\n' + PLANT,
        a='feed = 5\n[location.BAY]\nsensors = ["T2"]\n[grade]\nDC04 = 1\n',
    )
    assert "a.toml: location.BAY.sensors: plant.toml gives it already; give it once" in lines
    assert "a.toml: grade.DC04: plant.toml gives it already; give it once" in lines


def test_includes_in_a_circle_and_twice_are_refused(tmp_path: Path) -> None:
    """The circle is told in full."""
    assert problems(tmp_path, 'include = ["a.toml"]\n' + PLANT, a='include = ["./plant.toml"]\n') == [
        "a.toml: include: plant.toml includes a.toml includes plant.toml, a circle; take one of them out"
    ]
    assert problems(
        tmp_path, 'include = ["a.toml", "b.toml"]\n' + PLANT, a='include = ["b.toml"]\n', b=""
    ) == ["plant.toml: include: b.toml is included already; name it once"]
    assert problems(tmp_path, 'include = "a.toml"\n' + PLANT) == [
        'plant.toml: include: allowed is a list of files in quotes: ["grades.toml"]'
    ]


def test_what_a_missing_include_may_hold_is_not_called_missing(tmp_path: Path) -> None:
    """The other faults of what could be read are told all the same."""
    lines = problems(tmp_path, 'include = ["grades.toml"]\n[site]\nnam = "x"\n')
    assert lines == [
        "plant.toml: include: grades.toml: No such file or directory; name a file relative to plant.toml",
        'plant.toml: site.nam: is no known key (did you mean "name"?); allowed are name, timezone',
    ]


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"[site]\nname = \n", "plant.toml: line 2, column 8: Invalid value (TOML syntax)"),
        (b"[site\n", "plant.toml: line 1, column 6: "),
        (b'[site]\nname = "a"\nname = "b"\n', "plant.toml: line 3, column 11: Cannot overwrite a value"),
        (b'[site]\nname = "', "plant.toml: end of document: "),
        (b'[site]\nname = "K\xfchlhalle"\n', "plant.toml: byte 17 is not UTF-8; save the file as UTF-8"),
        (b"a = " + b"[" * 100_000, "plant.toml: "),
    ],
)
def test_broken_toml_is_told_with_its_place(tmp_path: Path, content: bytes, words: str) -> None:
    """Line and column, or byte."""
    (tmp_path / "plant.toml").write_bytes(content)
    with pytest.raises(SettingsError) as told:
        load_settings(tmp_path / "plant.toml")
    (line,) = told.value.problems
    assert line.removeprefix(f"{tmp_path}/").startswith(words)


def test_a_missing_file_says_how_to_name_another(tmp_path: Path) -> None:
    """On the command line or in the environment; so does a folder."""
    for path in (tmp_path / "none.toml", tmp_path):
        with pytest.raises(
            SettingsError, match="name the settings file with --config FILE or in AGEWATCH_CONFIG"
        ):
            load_settings(path)


def test_an_empty_file_lacks_what_every_plant_has(tmp_path: Path) -> None:
    """Site, locations and grades."""
    assert problems(tmp_path, "") == [
        "plant.toml: site: is missing; needed is a table",
        "plant.toml: location: is missing; needed is a table",
        "plant.toml: grade: is missing; needed is a table",
    ]


@pytest.mark.parametrize("start", ["2026-05-01T00:00:00Z", '"2026-05-01T02:00:00+02:00"'])
def test_a_replay_starts_at_any_rfc_3339_time(tmp_path: Path, start: str) -> None:
    """In quotes or as TOML has it."""
    clock = load(tmp_path, f'{PLANT}[clock]\nkind = "replay"\nstart = {start}\nrate = 600\n').settings.clock
    assert clock.start == datetime(2026, 5, 1, tzinfo=UTC)


@pytest.mark.parametrize("start", ["2026-05-01T00:00:00", '"2026-05-01 00:00"', '"May"', "5", "2026-05-01"])
def test_a_start_without_its_offset_is_refused(tmp_path: Path, start: str) -> None:
    """It could be any of twenty-five hours."""
    (line,) = problems(tmp_path, f'{PLANT}[clock]\nkind = "replay"\nstart = {start}\n')
    assert line.startswith("plant.toml: clock.start: ")
    assert "2026-05-01T00:00:00Z" in line


def test_a_part_that_is_silent_has_the_risk_of_its_kind(tmp_path: Path) -> None:
    """Exposed parts are pulled from 0.10 on, others from 0.25 on."""
    text = "[part.a]\nexposed = true\n[part.b]\n[part.c]\nexposed = true\nraise_risk = 0.05\n"
    parts = load(tmp_path, PLANT + text).settings.part
    assert {name: part.pull_risk for name, part in parts.items()} == {"a": 0.10, "b": 0.25, "c": 0.05}


def test_settings_are_only_read(tmp_path: Path) -> None:
    """Nobody changes them on the way."""
    settings = load(tmp_path, PLANT).settings
    with pytest.raises(ValueError, match="frozen"):
        settings.site.name = "Other"  # type: ignore[misc]


def test_settings_do_not_wait_for_what_they_do_not_need() -> None:
    """Reading settings loads neither numpy nor the store."""
    program = (
        "import json, sys; import agewatch.plant.settings_file, agewatch.intake; "
        "print(json.dumps([name for name in ('numpy', 'scipy', 'sqlalchemy', 'textual') if name in sys.modules]))"
    )
    done = subprocess.run([sys.executable, "-c", program], capture_output=True, check=True, text=True)
    assert json.loads(done.stdout) == []
