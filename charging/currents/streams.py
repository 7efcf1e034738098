"""Ions that stream past the spacecraft, for the march: what streams, and what it brings.

The closed forms and their two limits stand in `charging.currents.flow`; here they meet the
surfaces, the sheath weight and the electrons that such ions release.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.constants import e

from charging.currents.collection import SheathWeight, rounded_pull
from charging.currents.flow import plane_limit
from charging.currents.focus_table import FocusPlace, FocusTable, focus_table
from environments.species import Species
from materials.record import Material

Array = NDArray[np.float64]


MOST_ATTRACTION_V = 3e4
"""Beyond this potential the focused current grows in proportion."""


class Stream(NamedTuple):
    """Q kinds of directed ions at m times past S surfaces.

    density_m3, temperature_eV, speed_m_s : ndarray [m, Q]; ram_m_s : ndarray [m, S, Q], speed
    of each surface into the plasma along its outward normal, negative on the wake side.
    """

    density_m3: Array
    temperature_eV: Array
    speed_m_s: Array
    ram_m_s: Array


@dataclass(frozen=True, slots=True)
class Streams:
    """Kinds of directed ions, the number of surfaces they pass, their orbits round a body.

    Without `focus` an attracted species counts as in a thin sheath.
    """

    species: tuple[Species, ...]
    surfaces: int
    focus: FocusTable | None = None

    def stream(self, row: Array) -> Stream:
        """Split rows [m, Q (3 + S)] of density, pressure, speed and ram speeds."""
        kinds = len(self.species)
        density, pressure = row[..., :kinds], row[..., kinds : 2 * kinds]
        present = density > 0.0
        temperature = np.where(present, pressure / np.where(present, density, 1.0), 1.0)
        ram = row[..., 3 * kinds :].reshape(*row.shape[:-1], self.surfaces, kinds)
        return Stream(density, temperature, row[..., 2 * kinds : 3 * kinds], ram)


class Arrived(NamedTuple):
    """What directed ions bring, each [..., S], with derivatives by the surface's potential.

    collected_A_m2 and its slope; released_A_m2, electrons that they set free, before escape,
    and its slope.
    """

    collected_A_m2: Array
    slope: Array
    released_A_m2: Array
    released_slope: Array


@dataclass(frozen=True, slots=True)
class StreamModel:
    """Directed ions of Q kinds on S surfaces.

    Attributes
    ----------
    mass_kg, charge_number : ndarray [Q]
    yield_peak, yield_peak_energy_eV : ndarray [S], or [U, S] of several models
        Of electrons released by ions at normal incidence (Whipple 1981, form from memory).
    focus : FocusTable or None
        Limit of a thick sheath; None: thin everywhere.
    """

    mass_kg: Array
    charge_number: Array
    yield_peak: Array
    yield_peak_energy_eV: Array
    focus: FocusTable | None = None

    def of(self, table: NDArray[np.intp]) -> "StreamModel":
        """Yields [m, S] of the tables [m] of several models."""
        return StreamModel(
            self.mass_kg,
            self.charge_number,
            self.yield_peak[table],
            self.yield_peak_energy_eV[table],
            self.focus,
        )

    def place(self, stream: Stream) -> FocusPlace | None:
        """Where a stream stands in the table of focused orbits: the same for all potentials."""
        if self.focus is None:
            return None
        thermal = np.sqrt(2.0 * e * stream.temperature_eV / self.mass_kg)[..., None, :]
        speed = stream.speed_m_s[..., None, :]
        cosine = stream.ram_m_s / np.where(speed > 0.0, speed, 1.0)
        return self.focus.place(speed / thermal, cosine)

    def arrived(
        self,
        potential_V: Array,
        stream: Stream,
        sheath: SheathWeight,
        place: FocusPlace | None = None,
    ) -> Arrived:
        """Currents on surfaces at potentials [..., S].

        Parameters
        ----------
        potential_V : ndarray [..., S]
        stream : Stream
        sheath : SheathWeight
            Share of the thick limit and its slope, each [..., S].
        place : FocusPlace, optional
            From `place`, where many potentials share a moment.
        """
        phi = potential_V[..., None]
        density, temperature = stream.density_m3[..., None, :], stream.temperature_eV[..., None, :]
        # ions are attracted by negative potentials; the corner at 0 V is rounded
        pull, rise = rounded_pull(-phi, temperature / self.charge_number)
        current, slope = plane_limit(
            phi + pull, density, temperature, self.mass_kg, self.charge_number, 1.0, stream.ram_m_s
        )
        slope = slope * (1.0 - rise)
        if self.focus is not None and bool(np.any(pull > 0.0)):
            own = self.place(stream) if place is None else place
            assert own is not None
            gain, d_gain = self._focused(pull, rise, density, temperature, own)
            weight, d_weight = sheath.weight[..., None], sheath.slope[..., None]
            slope = slope + weight * d_gain + d_weight * gain
            current = current + weight * gain
        energy_eV = 0.5 * self.mass_kg / e * stream.speed_m_s[..., None, :] ** 2
        impact = np.maximum(energy_eV - self.charge_number * phi, 0.0)
        x = impact / self.yield_peak_energy_eV[..., None]
        # electrons per ion; the current counts charges
        per_ion = 2.0 * self.yield_peak[..., None] * np.sqrt(x) / (1.0 + x)
        safe = np.where(impact > 0.0, impact, 1.0)
        per_volt = np.where(
            impact > 0.0, -self.charge_number * per_ion * (0.5 / safe) * (1.0 - x) / (1.0 + x), 0.0
        )
        ions, d_ions = current / self.charge_number, slope / self.charge_number
        return Arrived(
            current.sum(axis=-1),
            slope.sum(axis=-1),
            (ions * per_ion).sum(axis=-1),
            (d_ions * per_ion + ions * per_volt).sum(axis=-1),
        )

    def _focused(
        self, pull_V: Array, rise: Array, density: Array, temperature: Array, place: FocusPlace
    ) -> tuple[Array, Array]:
        """What a thick sheath brings beyond a thin one [..., S, Q], and its slope by potential.

        The change of the table from no attraction, so that nothing jumps at 0 V.
        """
        assert self.focus is not None
        thermal = np.sqrt(2.0 * e * temperature / self.mass_kg)
        per_volt = self.charge_number / temperature
        found = self.focus.along(place, pull_V * per_volt)
        scale = e * self.charge_number * density * thermal / (2.0 * np.sqrt(np.pi))
        return scale * (found.flux - found.free), -scale * found.slope * rise * per_volt


def focus_of(species: Sequence[Species], density: Array, temperature: Array,
             speed: Array) -> FocusTable:  # fmt: skip
    """Table of focused orbits for the speeds over the thermal ones that a run meets.

    density_m3, temperature_eV, speed_m_s : ndarray [K, Q].
    """
    lows, highs, most = [], [], []
    for q, one in enumerate(species):
        present = density[:, q] > 0.0
        thermal = np.sqrt(2.0 * e * temperature[present, q] / one.mass_kg)
        ratio = speed[present, q] / thermal
        lows.append(float(ratio.min()))
        highs.append(float(ratio.max()))
        cold = float(temperature[present, q].min())
        most.append(abs(one.charge_number) * MOST_ATTRACTION_V / cold)
    return focus_table(lows, highs, most)


def stream_model(materials: Sequence[Material], streams: Streams) -> StreamModel:
    """Directed ions on surfaces of the materials given."""
    emits = [material.emits for material in materials]
    return StreamModel(
        np.array([s.mass_kg for s in streams.species]),
        np.array([float(s.charge_number) for s in streams.species]),
        np.array([m.value("ion_yield_peak") if on else 0.0
                  for m, on in zip(materials, emits, strict=True)]),
        np.array([m.value("ion_yield_peak_energy_eV") if on else 1.0
                  for m, on in zip(materials, emits, strict=True)]),
        streams.focus,
    )  # fmt: skip


def gathered(models: Sequence[StreamModel | None]) -> StreamModel | None:
    """Several models of the same kinds as one, its yields [U, S]; None without any."""
    found = [model for model in models if model is not None]
    if not found:
        return None
    return StreamModel(
        found[0].mass_kg,
        found[0].charge_number,
        np.stack([model.yield_peak for model in found]),
        np.stack([model.yield_peak_energy_eV for model in found]),
        found[0].focus,
    )
