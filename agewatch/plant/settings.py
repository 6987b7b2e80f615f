"""The settings of a plant, as its TOML files give them. Validated once, then only read.

Every model refuses unknown keys. `agewatch/plant/settings_file.py` reads the files and turns every fault into a
line that names file, key and what is allowed.
"""

from __future__ import annotations

from datetime import timedelta
from typing import Annotated, Literal, Self

from pydantic import AwareDatetime, BaseModel, ConfigDict, Field, model_validator

from agewatch.plant.contradictions import Contradiction, ContradictionError, contradictions
from agewatch.plant.nearest import unknown
from agewatch.plant.setting_values import (
    Duration,
    Encoding,
    Interval,
    MessageType,
    Name,
    NotNegative,
    Number,
    Path,
    Positive,
    ReceiverUrl,
    Share,
    StoreUrl,
    Time,
    TimeFormat,
    TimeZone,
)
from agewatch.plant.tables import TABLES


class _Section(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, strict=True)


class Site(_Section):
    """The plant."""

    name: Name
    timezone: TimeZone = "UTC"
    """Zone in which the board and the reports show times."""


class StoreSettings(_Section):
    """Where the daemon keeps what it knows."""

    url: StoreUrl = "sqlite:///var/agewatch.db"


class ClockSettings(_Section):
    """The system's clock, or a replay of the past at a rate."""

    kind: Literal["system", "replay"] = "system"
    start: Annotated[AwareDatetime, Time] | None = None
    rate: Positive = 1.0

    @model_validator(mode="after")
    def _replay_has_a_start(self) -> Self:
        if self.kind == "replay" and self.start is None:
            raise ValueError('a replay clock needs start = "2026-05-01T00:00:00Z" (any RFC 3339 time)')
        if self.kind == "system" and self.model_fields_set & {"start", "rate"}:
            raise ValueError('start and rate belong to kind = "replay"; the system clock takes neither')
        return self


class Feed(_Section):
    """One source of one canonical table."""

    table: Literal["coils", "moves", "presses", "temperatures", "outlook", "lab"]
    path: Path
    """File or pattern, relative to the settings file."""
    every: Interval = timedelta(minutes=5)
    timezone: TimeZone = "UTC"
    """Zone of times that carry no offset."""
    local_times: Literal["refuse", "earlier", "later"] = "refuse"
    """What an hour that occurs twice (or never) when the clocks change stands for."""
    columns: dict[str, str] = {}
    """Canonical name = the source's own name; in a wide temperature file: sensor = the source's own name."""
    ignore: list[str] = []
    """Columns of the source that are not read (in a wide temperature file every other column is a sensor)."""
    empty: list[str] = []
    """Texts that stand for an empty cell, for example "NULL" or "-11111"."""
    separator: Literal[",", ";", "\t", "auto"] = "auto"
    decimal: Literal[".", ","] = "."
    encoding: Encoding = "utf-8"
    time_format: TimeFormat = ""
    """A strptime pattern for times that are not RFC 3339."""
    stale_after: Interval | None = None
    """Alarm when nothing new came for this long."""

    @model_validator(mode="after")
    def _columns_are_canonical(self) -> Self:
        known = TABLES[self.table].column_names
        wrong: list[Contradiction] = []
        if self.table != "temperatures":
            strange = [name for name in self.columns if name not in known]
            wrong = [(("columns", name), unknown(name, known, f"column of {self.table}")) for name in strange]
        wrong += [
            (("columns", name), f"{theirs} also stands under ignore; a column is read or ignored")
            for name, theirs in self.columns.items()
            if theirs in self.ignore
        ]
        if wrong:
            raise ContradictionError(wrong)
        return self

    @property
    def name(self) -> str:
        """How messages and alarms call this feed."""
        return f"{self.table}:{self.path}"


class Location(_Section):
    """A place where coils lie, and how it exchanges heat with them."""

    sensors: list[Name] = []
    kind: Literal["bay", "yard", "transport"] = "bay"
    surface_w_m2k: Positive | None = None
    """Heat transfer of a coil's surface; silent: 6 for bare coils, 9 for wrapped ones."""
    lag_factor: Positive = 1.25
    lag_h: Positive | None = None
    """Time constant of every coil here, in place of the one that its size implies."""


class Channel(_Section):
    """One diffusing solute of a grade."""

    activation_kj_mol: Positive = 84.1
    activation_spread_kj_mol: NotNegative = 0.0
    exponent: Annotated[float, Field(gt=0, le=2)] = 2 / 3
    tau_days: Positive | None = None
    tau_spread: NotNegative = 0.6
    dislocation_density_per_m2: Positive | None = None
    density_per_percent_temper: NotNegative = 0.0

    @model_validator(mode="after")
    def _one_rate(self) -> Self:
        if (self.tau_days is None) == (self.dislocation_density_per_m2 is None):
            raise ValueError("give either tau_days or dislocation_density_per_m2, not both and not neither")
        return self


class Grade(_Section):
    """How a steel ages, and its tensile values where the certificate is silent."""

    aging: bool = True
    fitted: bool = False
    """True once this plant's own tests support the numbers; until then dates are marked `starting point`."""
    source: str = ""
    rp02_mpa: Positive
    rm_mpa: Positive
    n_value: Annotated[float, Field(gt=0, lt=1)]
    temper_elongation_pct: NotNegative = 1.0
    rp02_spread: NotNegative = 0.0
    """Scatter within the grade, for coils whose certificate is silent."""
    rm_spread: NotNegative = 0.0
    n_spread: NotNegative = 0.0
    rise_saturation_mpa: Positive = 30.0
    rise_saturation_spread: NotNegative = 0.15
    masking_mpa: NotNegative = 0.0
    masking_spread_mpa: NotNegative = 0.0
    channel: dict[Literal["carbon", "nitrogen"], Channel] = {}

    @model_validator(mode="after")
    def _can_be_assessed(self) -> Self:
        if self.aging and not self.channel:
            raise ValueError(
                "an aging grade needs at least one channel, for example [grade.NAME.channel.carbon]"
            )
        if self.rm_mpa <= self.rp02_mpa:
            raise ValueError("rm_mpa must be above rp02_mpa")
        return self


class Part(_Section):
    """What is pressed from a coil, and how much plateau it bears."""

    ype_limit_pct: Positive | None = None
    exposed: bool = False
    raise_risk: Share | None = None
    """Risk from which the coil is to be pulled; silent: 0.10 for exposed parts, 0.25 for others."""
    lead_time: Duration = timedelta(hours=24)
    """What logistics needs to bring a coil forward."""

    @property
    def pull_risk(self) -> float:
        return self.raise_risk if self.raise_risk is not None else (0.10 if self.exposed else 0.25)


class DefaultCoil(_Section):
    """The coil that a missing mass, width or bore stands for."""

    mass_kg: Positive = 15_000.0
    width_mm: Positive = 1250.0
    bore_mm: Positive = 610.0


class OutlookSettings(_Section):
    """Temperatures to come."""

    horizon_days: Annotated[float, Field(gt=0, le=1000)] = 120.0
    pull_horizon_days: Annotated[float, Field(gt=0, le=1000)] = 14.0
    """Without a planned pressing, a return inside this many days asks for a pull."""
    monthly_normals_c: Annotated[list[Number], Field(min_length=12, max_length=12)] | None = None
    """Mean air temperature of January … December, for the time that no outlook feed covers."""


class Screening(_Section):
    """When a reading is not believed."""

    lowest_c: Number = -40.0
    highest_c: Number = 65.0
    gap: Duration = timedelta(hours=3)
    """Longest silence that a straight line may bridge without counting as estimated."""


class AlarmSettings(_Section):
    """When a condition becomes an alarm, and when it ends."""

    on_delay: Duration = timedelta(minutes=0)
    off_delay: Duration = timedelta(minutes=30)
    sensor_silent_after: Duration = timedelta(hours=3)
    rejects_limit: Annotated[int, Field(ge=0)] = 100
    """Open rejects of one feed from which it is alarmed."""


class DaemonSettings(_Section):
    """The work of the daemon."""

    assess_every: Interval = timedelta(minutes=1)
    control_socket: str = "var/agewatch.sock"
    http_port: Annotated[int, Field(ge=0, le=65535)] = 9464
    """Port of /livez, /readyz and /metrics on loopback; 0 turns them off."""


class Endpoint(_Section):
    """A receiver of messages."""

    name: Name
    url: ReceiverUrl
    secret_env: str | None = None
    secret_file: str | None = None
    types: list[MessageType] = []
    """Message types that it takes; empty: all."""
    connect_timeout: Duration = timedelta(seconds=5)
    read_timeout: Duration = timedelta(seconds=15)
    ca_file: str | None = None
    attempts: Annotated[int, Field(ge=1)] = 12

    @model_validator(mode="after")
    def _names_its_secret_once(self) -> Self:
        if (self.secret_env is None) == (self.secret_file is None):
            raise ValueError(
                "name the signing secret by either secret_env or secret_file; it is never in the settings"
            )
        return self


class Settings(_Section):
    """All settings of a plant."""

    site: Site
    store: StoreSettings = StoreSettings()
    clock: ClockSettings = ClockSettings()
    feed: list[Feed] = []
    location: dict[str, Location]
    grade: dict[str, Grade]
    part: dict[str, Part] = {}
    default_coil: DefaultCoil = DefaultCoil()
    outlook: OutlookSettings = OutlookSettings()
    screening: Screening = Screening()
    alarm: AlarmSettings = AlarmSettings()
    daemon: DaemonSettings = DaemonSettings()
    endpoint: list[Endpoint] = []

    @model_validator(mode="after")
    def _agree_with_each_other(self) -> Self:
        if found := contradictions(self):
            raise ContradictionError(found)
        return self
