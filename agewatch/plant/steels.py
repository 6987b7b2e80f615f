"""What every coil is made of: its certificate, and its grade where the certificate is silent."""

from __future__ import annotations

import numpy as np

from agewatch.aging.assess import Steels
from agewatch.aging.kinetics import DAY_S, Floats, harper_tau_s
from agewatch.aging.settled import Rows
from agewatch.aging.yielding import FlowCurve
from agewatch.plant.inventory import Coded, Inventory
from agewatch.plant.settings import Channel, Grade, Settings

CERTIFICATE = ("rp02_mpa", "rm_mpa", "n_value")
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
    return dict(grade.channel) or {"carbon": Channel(tau_days=np.inf)}


def activations_j_mol(settings: Settings) -> tuple[float, ...]:
    """The activation energies of all channels of all grades, each once."""
    energies = {
        channel.activation_kj_mol * 1e3
        for grade in settings.grade.values()
        for channel in channels(grade).values()
    }
    return tuple(sorted(energies))


def coil_steels(inventory: Inventory, settings: Settings, grade: Rows) -> Steels:
    """Steels of coils whose grades are rows of `settings.grade` (all ≥ 0); τ of one that does not age is inf."""
    grades = [*settings.grade.values()]
    energies = activations_j_mol(settings)
    slots = max(len(channels(each)) for each in grades)
    channel = np.full((len(grades), slots), -1, dtype=np.intp)
    exponent = np.ones((len(grades), slots))
    tau_s = np.full((len(grade), slots), np.inf)
    temper_pct = given_or_grade(inventory.temper_elongation_pct, grades, grade, "temper_elongation_pct")
    for row, each in enumerate(grades):
        of_grade = np.flatnonzero(grade == row)
        for slot, (solute, own) in enumerate(channels(each).items()):
            channel[row, slot] = energies.index(own.activation_kj_mol * 1e3)
            exponent[row, slot] = own.exponent
            if each.aging:
                tau_s[of_grade, slot] = _tau_s(own, solute, temper_pct[of_grade])
    return Steels(
        channel[grade],
        tau_s,
        exponent[grade],
        np.array([each.rise_saturation_mpa for each in grades])[grade],
        np.array([each.masking_mpa for each in grades])[grade],
        FlowCurve.of_certificate(*_tensile_values(inventory, grades, grade)),
    )


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
    codes = np.where(np.isin(codes, none), -1, codes).astype(np.int32)
    return Coded(codes, labels)


def given_or_grade(values: Floats, grades: list[Grade], grade: Rows, name: str) -> Floats:
    """The certificate's value, else the grade's."""
    of_grade = np.array([getattr(each, name) for each in grades])
    return np.where(np.isnan(values), of_grade[grade], values)


def _tensile_values(
    inventory: Inventory, grades: list[Grade], grade: Rows
) -> tuple[Floats, Floats, Floats]:
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
