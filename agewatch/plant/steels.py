"""What every coil is made of: its certificate, and its grade where the certificate is silent."""

from __future__ import annotations

import numpy as np

from agewatch.aging.kinetics import DAY_S, Floats, harper_tau_s
from agewatch.aging.settled import Rows
from agewatch.aging.steels import Spreads, Steels
from agewatch.aging.yielding import FlowCurve
from agewatch.plant.inventory import Coded, Inventory
from agewatch.plant.settings import Channel, Grade, Settings

CERTIFICATE = ("rp02_mpa", "rm_mpa", "n_value")
SPREADS = ("rp02_spread", "rm_spread", "n_spread")
SIZE = ("mass_kg", "width_mm")
_WORDS = {
    "rp02_mpa": "Rp0.2",
    "rm_mpa": "Rm",
    "n_value": "n",
    "temper_elongation_pct": "temper elongation",
    "mass_kg": "mass",
    "width_mm": "width",
}


def channels(grade: Grade) -> dict[str, Channel]:
    """The grade's channels, the main one first; one that does not age counts its equivalent age by carbon's."""
    given: dict[str, Channel] = {solute: channel for solute, channel in grade.channel.items()}  # noqa: C416
    return given or {"carbon": Channel(tau_days=1.0)}


def activations_j_mol(settings: Settings) -> tuple[float, ...]:
    """The activation energies of all channels of all grades, as they are and raised by their spreads, each once."""
    energies = {
        (channel.activation_kj_mol + raised * channel.activation_spread_kj_mol) * 1e3
        for grade in settings.grade.values()
        for channel in channels(grade).values()
        for raised in (0, 1)
    }
    return tuple(sorted(energies))


def coil_channels(settings: Settings, grade: Rows, *, raised: bool = False) -> Rows:
    """Places of each coil's channels in `activations_j_mol`, (n_coils, n_channels); -1: none."""
    energies = activations_j_mol(settings)
    grades = [channels(each) for each in settings.grade.values()]
    channel = np.full((len(grades), max(len(each) for each in grades)), -1, dtype=np.intp)
    for row, each in enumerate(grades):
        for slot, own in enumerate(each.values()):
            spread = own.activation_spread_kj_mol if raised else 0.0
            channel[row, slot] = energies.index((own.activation_kj_mol + spread) * 1e3)
    return channel[grade]


def coil_steels(inventory: Inventory, settings: Settings, grade: Rows) -> Steels:
    """Steels of coils whose grades are rows of `settings.grade` (all ≥ 0); τ of one that does not age is inf."""
    grades = [*settings.grade.values()]
    channel = coil_channels(settings, grade)
    exponent = np.ones(channel.shape)
    tau_s = np.full(channel.shape, np.inf)
    temper_pct = given_or_grade(inventory.temper_elongation_pct, grades, grade, "temper_elongation_pct")
    for row, each in enumerate(grades):
        of_grade = np.flatnonzero(grade == row)
        for slot, (solute, own) in enumerate(channels(each).items() if each.aging else ()):
            exponent[of_grade, slot] = own.exponent
            tau_s[of_grade, slot] = _tau_s(own, solute, temper_pct[of_grade])
    return Steels(
        channel,
        tau_s,
        exponent,
        np.array([each.rise_saturation_mpa for each in grades])[grade],
        np.array([each.masking_mpa for each in grades])[grade],
        FlowCurve.of_certificate(*_tensile_values(inventory, grades, grade)),
    )


def coil_spreads(inventory: Inventory, settings: Settings, grade: Rows, limit_pct: Floats) -> Spreads:
    """Spreads of coils whose parts bear `limit_pct` (n_coils,)."""
    grades = [*settings.grade.values()]
    log_tau = np.zeros((len(grades), max(len(channels(each)) for each in grades)))
    for row, each in enumerate(grades):
        own = [channel.tau_spread for channel in channels(each).values()] if each.aging else []
        log_tau[row, : len(own)] = own
    masking_mpa = np.array([each.masking_spread_mpa for each in grades])[grade]
    needed_mpa = np.hypot(masking_mpa, _assumed_spread_mpa(inventory, grades, grade, limit_pct))
    distinct, code = np.unique(needed_mpa, return_inverse=True)
    return Spreads(
        log_tau[grade],
        needed_mpa,
        np.array([each.rise_saturation_spread for each in grades])[grade],
        grade * len(distinct) + code,
    )


def _assumed_spread_mpa(inventory: Inventory, grades: list[Grade], grade: Rows, limit_pct: Floats) -> Floats:
    """Spread of the rise that the limit needs, from the tensile values that the grade stands in for, MPa.

    First order, about the grade's own values, so that coils with the same gaps share it.
    """
    medians = [np.array([getattr(each, name) for each in grades])[grade] for name in CERTIFICATE]
    variance = np.zeros(len(grade))
    for place, (name, spread) in enumerate(zip(CERTIFICATE, SPREADS, strict=True)):
        silent = np.isnan(getattr(inventory, name))
        by = np.array([getattr(each, spread) for each in grades])[grade] * silent
        if by.any():
            shifted = [value * np.exp(by) if at == place else value for at, value in enumerate(medians)]
            needed = [
                FlowCurve.of_certificate(*values).effective_rise_mpa(limit_pct)
                for values in (medians, shifted)
            ]
            variance += np.nan_to_num((needed[1] - needed[0]) ** 2, nan=0.0)
    return np.sqrt(variance)


def assumed_values(inventory: Inventory) -> Coded:
    """For each coil, the values that its certificate lacks and that its grade or the default coil stands in for."""
    names = (*CERTIFICATE, "temper_elongation_pct", *SIZE)
    bits = np.zeros(len(inventory), dtype=np.int32)
    for place, name in enumerate(names):
        bits |= np.isnan(getattr(inventory, name)).astype(np.int32) << place
    present, codes = np.unique(bits, return_inverse=True)
    labels = tuple(
        ", ".join(_WORDS[name] for place, name in enumerate(names) if bit >> place & 1) for bit in present
    )
    none = np.flatnonzero(present == 0)
    return Coded(np.where(np.isin(codes, none), -1, codes).astype(np.int32), labels)


def given_or_grade(values: Floats, grades: list[Grade], grade: Rows, name: str) -> Floats:
    """The certificate's value, else the grade's."""
    of_grade = np.array([getattr(each, name) for each in grades])
    return np.where(np.isnan(values), of_grade[grade], values)


def _tensile_values(inventory: Inventory, grades: list[Grade], grade: Rows) -> tuple[Floats, Floats, Floats]:
    """Rp0.2, Rm and n; a certificate value that contradicts the grade's is dropped with its fellows."""
    own = [given_or_grade(getattr(inventory, name), grades, grade, name) for name in CERTIFICATE]
    of_grade = [np.array([getattr(each, name) for each in grades])[grade] for name in CERTIFICATE]
    sound = own[1] > own[0]
    rp02, rm, n = (np.where(sound, mine, theirs) for mine, theirs in zip(own, of_grade, strict=True))
    return rp02, rm, n


def _tau_s(channel: Channel, solute: str, temper_pct: Floats) -> Floats:
    if channel.tau_days is not None:
        return np.full(len(temper_pct), channel.tau_days * DAY_S)
    density = channel.dislocation_density_per_m2 or 0.0
    return harper_tau_s(density + channel.density_per_percent_temper * temper_pct, solute)
