"""Where a spacecraft flies and how it points: the tables [orbit] and [attitude] of a case."""

from __future__ import annotations

from datetime import UTC, datetime
from typing import Annotated, Literal, Self, TypeAlias

from pydantic import Field, model_validator

from charging.case_checks import LONGEST_RUN_H, check_kepler
from charging.case_mode_checks import check_attitude, check_orbit_file
from charging.case_types import (
    Angle,
    CsvFile,
    DataFile,
    Direction,
    Moment,
    Share,
    Table,
)

EARTH_EQUATORIAL_RADIUS_KM = 6378.137  # WGS-84 defining constant
_UNKNOWN_START = datetime(2000, 1, 1, tzinfo=UTC)


class OrbitKepler(Table):
    """Mean Kepler elements about the Earth at `epoch`, which is the start of the run."""

    kind: Literal["kepler"]
    center: Literal["earth"] = Field(default="earth", description="central body")
    epoch: Moment = Field(description="start of the run, UTC with Z")
    semi_major_axis_km: float = Field(gt=EARTH_EQUATORIAL_RADIUS_KM, le=1e6)
    eccentricity: float = Field(ge=0.0, lt=1.0)
    inclination_deg: float = Field(ge=0.0, le=180.0)
    raan_deg: Angle = Field(description="right ascension of the ascending node")
    argument_of_perigee_deg: Angle
    mean_anomaly_deg: Angle = Field(description="mean anomaly at epoch")

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_kepler(self, EARTH_EQUATORIAL_RADIUS_KM)
        return self


class OrbitFixed(Table):
    """No orbit: the same sun and plasma for the whole run, the standards' own analysis."""

    kind: Literal["fixed"]
    illumination: Share = Field(description="share of the solar disc in view, 0 to 1")
    sun_direction: Direction = Field(description="towards the Sun, body axes")
    epoch: Moment = Field(default=datetime(2000, 1, 1, tzinfo=UTC), description="start, UTC with Z")
    duration_h: float | None = Field(
        default=None, gt=0.0, le=LONGEST_RUN_H, description="length of the run, here or in [time]"
    )


class OrbitFile(Table):
    """An orbit from a file: CCSDS OEM, two-line elements, or a table (CSV, or orbit.nc)."""

    kind: Literal["oem", "tle", "table"]
    center: Literal["earth"] = Field(default="earth", description="central body")
    file: DataFile = Field(description="inside the folder of the case")
    start: Moment | None = Field(
        default=None,
        description="start of the run, UTC with Z; default: first time of the file, or the epoch "
        "of the elements",
    )

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_orbit_file(self)
        return self

    @property
    def epoch(self) -> datetime:
        """Start of the run; known once the file is read."""
        return _UNKNOWN_START if self.start is None else self.start


Orbit: TypeAlias = Annotated[OrbitKepler | OrbitFixed | OrbitFile, Field(discriminator="kind")]


class Attitude(Table):
    """How the body axes point; wings that track the Sun turn about body y in every law.

    nadir: +z to nadir, +x along velocity, +y = z × x; yaw steering: +z to nadir, the Sun in the
    half plane of +x; sun, inertial, spin, quaternions: by the keys below.
    """

    law: Literal["nadir", "yaw steering", "sun", "inertial", "spin", "quaternions"] = "nadir"
    toward_sun: Direction | None = Field(
        default=None, description="sun: body direction to the Sun, default +z"
    )
    toward_north: Direction | None = Field(
        default=None, description="sun: body direction nearest to celestial north, default +y"
    )
    x_axis: Direction | None = Field(default=None, description="inertial: +x among the stars")
    y_axis: Direction | None = Field(default=None, description="inertial: +y, made square to +x")
    axis: Direction | None = Field(
        default=None, description="spin: inertial direction of +z, about which the body turns"
    )
    period_s: float | None = Field(
        default=None, ge=0.01, le=1e7, description="spin: of one turn, x towards y"
    )
    phase_deg: Angle | None = Field(default=None, description="spin: turn at the start, default 0")
    resolved: bool | None = Field(
        default=None, description="spin: follow every turn; default false: mean light of a turn"
    )
    file: CsvFile | None = Field(default=None, description="quaternions: CSV file")

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_attitude(self)
        return self
