"""The table [plasma] of a case: one plasma, regions of space, or a file of moments."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Annotated, Literal, Self, TypeAlias

from pydantic import Field, model_validator

from charging.case_checks import LONGEST_RUN_H, check_event
from charging.case_types import (
    MOST_ENTRIES,
    CsvFile,
    FreeText,
    Moment,
    Reference,
    Table,
)
from charging.errors import Problem, ProblemsFound

if TYPE_CHECKING:
    import numpy as np

    from environments.activity import Activity

Angle180: TypeAlias = Annotated[float, Field(ge=0.0, le=180.0)]

QUANTITY_OF_KEY: Mapping[str, str] = {
    "kp": "kp",
    "bz_nT": "bz_nT",
    "pressure_nPa": "pressure_nPa",
    "wind_density_cm3": "density_cm3",
    "wind_speed_km_s": "speed_km_s",
    "wind_proton_temperature_eV": "proton_temperature_eV",
    "wind_electron_temperature_eV": "electron_temperature_eV",
}
"""Keys of the activity and their names in `environments.activity`, which says what is allowed."""


class PlasmaEvent(Table):
    """A second plasma mixed in: linear over the rise, whole for the hold, then fading."""

    onset: Moment | None = Field(default=None, description="begin of the rise, UTC with Z")
    onset_h: float | None = Field(default=None, ge=0.0, description="begin, hours from the start")
    rise_min: float = Field(ge=0.0, le=60.0 * LONGEST_RUN_H)
    hold_min: float = Field(ge=0.0, le=60.0 * LONGEST_RUN_H)
    decay_min: float = Field(
        gt=0.0, le=60.0 * LONGEST_RUN_H, description="time constant of the exponential decay"
    )
    use: Reference = Field(description="plasma of the event")

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_event(self)
        return self


class PlasmaSubstorm(Table):
    """An injection into the plasma sheet of the regions, from midnight towards dawn."""

    onset: Moment | None = Field(default=None, description="begin of the rise, UTC with Z")
    onset_h: float | None = Field(default=None, ge=0.0, description="begin, hours from the start")
    rise_min: float = Field(default=10.0, ge=0.0, le=60.0 * LONGEST_RUN_H)
    hold_min: float = Field(default=40.0, ge=0.0, le=60.0 * LONGEST_RUN_H)
    decay_min: float = Field(
        default=90.0, gt=0.0, le=60.0 * LONGEST_RUN_H,
        description="time constant of the exponential decay",
    )  # fmt: skip
    local_time_h: float = Field(
        default=0.0, ge=0.0, le=24.0, description="magnetic local time of its centre at onset"
    )
    electron_density_m3: float = Field(default=1.12e6, ge=0.0, le=1e9)
    electron_temperature_eV: float = Field(default=12e3, ge=10.0, le=2e5)
    ion_density_m3: float = Field(default=0.236e6, ge=0.0, le=1e9)
    ion_temperature_eV: float = Field(default=29.5e3, ge=10.0, le=2e5)

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_event(self)
        return self


class PlasmaTable(Table):
    """Plasma around the spacecraft and events on top of it."""

    use: Reference | None = Field(
        default=None, description="one plasma: library name (halflit plasmas) or file"
    )
    model: Literal["regions"] | None = Field(
        default=None, description="plasma of the regions of space that the orbit crosses"
    )
    file: CsvFile | None = Field(default=None, description="moments or spectra measured in time")
    around: Literal["moon", "sun"] | None = Field(
        default=None, description="regions of a fixed case: on the Moon, or far from all bodies"
    )
    solar_zenith_angle_deg: Angle180 | None = Field(
        default=None, description="regions on the Moon: the Sun from the local vertical"
    )
    kp: float | None = Field(default=None, ge=0.0, le=9.0, description="planetary index")
    bz_nT: float | None = Field(
        default=None, ge=-100.0, le=100.0, description="northward field of the solar wind"
    )
    pressure_nPa: float | None = Field(
        default=None, ge=0.02, le=200.0, description="dynamic pressure of the solar wind"
    )
    wind_density_cm3: float | None = Field(
        default=None, ge=0.02, le=300.0, description="protons at 1 AU"
    )
    wind_speed_km_s: float | None = Field(default=None, ge=150.0, le=3000.0)
    wind_proton_temperature_eV: float | None = Field(default=None, ge=0.05, le=2000.0)
    wind_electron_temperature_eV: float | None = Field(default=None, ge=0.5, le=500.0)
    activity: CsvFile | None = Field(
        default=None, description="file of Kp, F10.7 and solar wind in time"
    )
    arc: Reference | None = Field(
        default=None,
        description="plasma whose electrons above 100 eV precipitate in the nightside oval, on top "
        "of the average aurora",
    )
    accept_assumed: FreeText | None = Field(
        default=None, description="reason why a plasma of assumed figures may carry a verdict"
    )
    event: tuple[PlasmaEvent, ...] = Field(default=(), max_length=MOST_ENTRIES)
    substorm: tuple[PlasmaSubstorm, ...] = Field(default=(), max_length=MOST_ENTRIES)

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        found = list(_problems(self))
        if found:
            raise ProblemsFound(found)
        return self

    @property
    def base(self) -> str:
        """What a report calls the plasma: its name, "regions", or its file."""
        return self.use or self.model or self.file or ""

    @property
    def changes(self) -> bool:
        """Whether the plasma changes along the run apart from events."""
        return self.use is None

    @property
    def constants(self) -> dict[str, float]:
        """Activity as given here, by the names of `environments.activity`."""
        given = {name: getattr(self, key) for key, name in QUANTITY_OF_KEY.items()}
        return {name: value for name, value in given.items() if value is not None}


def _problems(table: PlasmaTable) -> Iterator[Problem]:
    given = [key for key in ("use", "model", "file") if getattr(table, key) is not None]
    if not given:
        allowed = 'use = "a plasma", model = "regions" or file = "moments.csv"'
        yield Problem(("use",), "is missing", missing=True, allowed=allowed)
    for key in given[1:]:
        message = f"stands beside {given[0]}; give one of the two"
        yield Problem((key,), message, value=getattr(table, key))
    if table.model is None:
        for key in (*QUANTITY_OF_KEY, "activity", "arc", "around", "solar_zenith_angle_deg"):
            if getattr(table, key) is not None:
                message = 'needs model = "regions"'
                yield Problem((key,), message, value=getattr(table, key))
        if table.substorm:
            yield Problem(("substorm",), 'needs model = "regions"')
    if table.solar_zenith_angle_deg is not None and table.around != "moon":
        message = 'needs around = "moon"'
        yield Problem(("solar_zenith_angle_deg",), message, value=table.solar_zenith_angle_deg)
    if table.around == "moon" and table.solar_zenith_angle_deg is None:
        message = 'is missing for around = "moon"'
        yield Problem(("solar_zenith_angle_deg",), message, missing=True, allowed="0 to 180")


def activity_problems(
    table: PlasmaTable, activity: Activity, epoch: np.datetime64, end_s: float
) -> Iterator[Problem]:
    """Yield what the file of the activity and the case say twice, and a file too short."""
    from environments.timescales import elapsed_s

    names = {name: key for key, name in QUANTITY_OF_KEY.items()}
    for name in sorted(set(activity.series) & set(table.constants)):
        message = f"is also a column of {table.activity}; give it once"
        yield Problem((names[name],), message, value=table.constants[name])
    if activity.times is not None:
        first, last = (float(t) for t in elapsed_s(epoch, activity.times[[0, -1]]))
        # Kp holds for three hours after its row
        last += 10800.0 if set(activity.series) == {"kp"} else 0.0
        if first > 1e-6 or last < end_s - 1e-6:
            yield Problem(
                ("activity",),
                "does not cover the run",
                value=table.activity,
                allowed=f"rows over it; it holds {activity.times[0]}Z to {activity.times[-1]}Z",
            )
