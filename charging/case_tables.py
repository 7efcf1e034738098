"""The tables of a case file as frozen, strict objects; attribute = key of the file.

Every number carries its unit in its name. Each table checks itself; what concerns several tables
is in :mod:`charging.case_checks`, which :class:`Case` runs. Read a file with
:func:`charging.case.load_case`.
"""

from __future__ import annotations

import math
from datetime import datetime
from typing import Annotated, ClassVar, Literal, Self, TypeAlias

from pydantic import Discriminator, Field, Tag, ValidationInfo, model_validator

from charging.case_checks import (
    check_case,
    check_limit,
    check_link,
    check_surface,
)
from charging.case_modes import Emitter, Mode
from charging.case_orbit import Attitude, Orbit, OrbitFile, OrbitFixed
from charging.case_plasma import PlasmaTable
from charging.case_shape import MOST_SHAPES, Shape, check_shapes
from charging.case_strings import ArrayString, Radiation
from charging.case_types import (
    LONGEST_ORBIT_H,
    MOST_ENTRIES,
    CsvFile,
    Direction,
    FreeText,
    LimitKind,
    Name,
    Positive,
    Reference,
    SolarActivity,
    Table,
    Temperature,
)

SolarBand: TypeAlias = Literal[
    "X-ray",
    "EUV",
    "FUV below Lyman-alpha",
    "Lyman-alpha",
    "FUV above Lyman-alpha",
    "MUV",
    "NUV",
]
"""Bands of `environments.spectrum.BANDS`, which needs numpy and cannot be read here."""
BandFactor: TypeAlias = Annotated[float, Field(ge=0.0, le=1e6)]


class Time(Table):
    """Length of the run, output grid and starting state."""

    duration_h: float | None = Field(
        default=None,
        gt=0.0,
        le=LONGEST_ORBIT_H,
        description="length of run; default for a file of an orbit: to its end",
    )
    output_step_s: float = Field(default=60.0, ge=1e-3, description="spacing of the output times")
    start: Literal["uncharged", "equilibrium"] = Field(
        default="uncharged",
        description="all potentials 0 V, or in equilibrium with the first moment",
    )


class Sun(Table):
    """Solar activity, distance, and the height below which air absorbs the ultraviolet."""

    f107: SolarActivity = Field(default=150.0, description="10.7 cm radio flux, 1e-22 W m-2 Hz-1")
    f107_81day: SolarActivity = Field(
        default_factory=lambda given: float(given["f107"]),
        description="81-day mean of f107; default: f107",
    )
    distance_au: float | None = Field(
        default=None,
        ge=0.01,
        le=100.0,
        description="distance from the Sun, fixed orbits only; default 1",
    )
    flare: dict[SolarBand, BandFactor] = Field(
        default_factory=dict, description="factor on the photons by band of the spectrum"
    )
    absorbing_height_km: float = Field(
        default=0.0, ge=0.0, le=1000.0, description="added to the Earth's radius for the shadow"
    )
    moon: bool = Field(default=False, description="also look for eclipses by the Moon")


class Body(Table):
    """Size and collecting geometry of the whole spacecraft."""

    radius_m: float = Field(gt=0.0, le=1000.0, description="radius of the equivalent sphere")
    collection: Literal["auto", "sphere", "plane", "cylinder"] = "auto"
    shadow: CsvFile | None = Field(
        default=None, description="table of lit shares of surfaces by direction of the Sun"
    )
    barrier: bool = Field(
        default=True, description="negative surfaces hold back electrons of their neighbours"
    )
    panels: int = Field(
        default=800, ge=100, le=3000, description="panels of the field around [[shape]], about"
    )


class Emission(Table):
    """Choice among published emission laws."""

    # the names are those of `materials.secondary.YIELD_LAWS`, whose import would load numpy
    secondary_law: Literal[
        "both",
        "sanders_inouye_1979",
        "lin_joy_2005",
        "sternglass_1954",
        "draine_salpeter_1979",
    ] = Field(
        default="both",
        description="both: an exponential law and one with a slow tail, the worse counts",
    )
    photo_escape: Literal["auto", "planar", "point source"] = Field(
        default="auto",
        description="photoelectrons leave as from a plane or a point; auto: by their Debye length",
    )


class SunlitEclipse(Table):
    """Surface temperature that relaxes between a sunlit and an eclipse value."""

    sunlit_K: Temperature
    eclipse_K: Temperature
    time_constant_min: Positive


def _number_or_table(value: object) -> str:
    if isinstance(value, str) and value.endswith(".csv"):
        return "file"
    return "table" if isinstance(value, dict | SunlitEclipse) else "number"


SurfaceTemperature: TypeAlias = Annotated[
    Annotated[Temperature, Tag("number")]
    | Annotated[SunlitEclipse, Tag("table")]
    | Annotated[CsvFile, Tag("file")],
    Discriminator(_number_or_table),
]


class Surface(Table):
    """One outer surface: material, area, and what lies behind it."""

    name: Name
    material: Reference = Field(description="library name (halflit materials) or file")
    surface_state: Literal["as recorded", "clean", "air-exposed", "aged"] = Field(
        default="as recorded", description="state of the surface for photoemission"
    )
    area_m2: float = Field(
        default=0.0, ge=1e-9, le=1e5, description="needed without face or faces, which give it"
    )
    face: Name | None = Field(default=None, description="of a [[shape]]: shape.face")
    faces: tuple[Name, ...] = Field(
        default=(), max_length=MOST_ENTRIES, description="several of them, instead of face"
    )
    thickness_m: float | None = Field(default=None, ge=1e-9, le=1.0, description="of a dielectric")
    normal: Direction | None = Field(default=None, description="outward, body axes")
    tracks_sun: bool = Field(default=False, description="turns about body y towards the Sun")
    side: Literal["front", "back"] | None = Field(default=None, description="of a sun tracker")
    attached_to: Name = Field(default="structure", description="structure or an isolated conductor")
    floating: bool = Field(default=False, description="an isolated conductor")
    capacitance_F: float | None = Field(
        default=None,
        ge=1e-20,
        le=1.0,
        description="of an isolated conductor to what it is attached to",
    )
    neighbours: tuple[Name, ...] = Field(default=(), max_length=MOST_ENTRIES)
    temperature_K: SurfaceTemperature | None = None
    shadow: CsvFile | None = Field(
        default=None, description="table of lit shares, before that of [body]"
    )

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_surface(self)
        return self

    @property
    def lies_on(self) -> tuple[str, ...]:
        """Faces of shapes that make up the surface; none without shapes."""
        return self.faces if self.face is None else (self.face,)


class Link(Table):
    """A resistor between two conductors."""

    between: tuple[Name, Name]
    resistance_ohm: float = Field(ge=1e-6, le=1e20)

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_link(self)
        return self


class MarginPolicy(Table):
    """Allowed value = limit / factor."""

    factor: float = Field(ge=1.0, le=100.0)
    basis: FreeText


class Limit(Table):
    """A limit that replaces the default of its kind and scope, else adds to them."""

    kind: LimitKind = Field(
        description="surface below or above structure; field in a dielectric; dielectric below or "
        "above a neighbouring conductor; difference of neighbours; energy stored in a film; "
        "structure against the plasma"
    )
    surfaces: tuple[Name, ...] | None = Field(
        default=None, max_length=MOST_ENTRIES, description="default: all"
    )
    allowed_V: Positive | None = None
    allowed_V_m: Positive | None = Field(default=None, description="for kind = field")
    allowed_J: Positive | None = Field(default=None, description="for kind = energy")
    requirement_id: FreeText | None = None
    source_document: FreeText | None = None
    clause: FreeText | None = None
    clause_verified: bool = Field(
        default=True, description="false: nobody has read the clause, so nothing is within it"
    )
    margin_policy: MarginPolicy | None = None
    reason: FreeText | None = None

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_limit(self)
        return self


class Review(Table):
    """What a design review evaluates besides the case's own plasma."""

    plasmas: tuple[Reference, ...] = Field(default=(), max_length=MOST_ENTRIES)
    ages: tuple[Literal["begin", "end"], ...] = Field(
        default=("begin", "end"),
        min_length=1,
        max_length=2,
        description="begin: surface states as given; end: all aged",
    )
    criteria: Literal["ECSS", "NASA", "JAXA"] = Field(
        default="ECSS", description="set of default limits; only the text of the first was read"
    )
    draws: int = Field(
        default=500, ge=500, le=100_000, description="random draws of the properties, at least"
    )
    seed: int = Field(default=1, ge=0, le=2**32 - 1, description="of these draws")
    statistical: FreeText | None = Field(
        default=None,
        description="reason why draws that all pass may override a corner that does not",
    )
    array_voltage_V: Positive | None = Field(
        default=None, description="largest voltage of a solar array; above 70 V: specialist review"
    )
    crew_outside: bool = Field(
        default=False, description="crew may be outside the vehicle: nothing is within for them"
    )


class Case(Table):
    """A whole case file."""

    title: FreeText
    orbit: Orbit
    time: Time = Field(default_factory=Time)
    sun: Sun = Field(default_factory=Sun)
    attitude: Attitude = Field(default_factory=Attitude)
    plasma: PlasmaTable
    body: Body
    emission: Emission = Field(default_factory=Emission)
    shape: tuple[Shape, ...] = Field(default=(), max_length=MOST_SHAPES)
    surface: tuple[Surface, ...] = Field(max_length=MOST_ENTRIES)
    link: tuple[Link, ...] = Field(default=(), max_length=MOST_ENTRIES)
    mode: tuple[Mode, ...] = Field(default=(), max_length=MOST_ENTRIES)
    emitter: tuple[Emitter, ...] = Field(default=(), max_length=MOST_ENTRIES)
    string: tuple[ArrayString, ...] = Field(default=(), max_length=MOST_ENTRIES)
    radiation: Radiation = Field(default_factory=Radiation)
    limit: tuple[Limit, ...] = Field(default=(), max_length=MOST_ENTRIES)
    review: Review = Field(default_factory=Review)

    STRUCTURE: ClassVar[str] = "structure"

    @model_validator(mode="after")
    def _consistent(self, info: ValidationInfo) -> Self:
        check_case(self, orbit_only=bool(info.context and info.context.get("orbit_only")))
        check_shapes(self)
        return self

    @property
    def resolved(self) -> bool:
        """Whether start and length of the run are known, without the file of the orbit."""
        return not isinstance(self.orbit, OrbitFile) or (
            self.orbit.start is not None and self.time.duration_h is not None
        )

    @property
    def alternatives(self) -> tuple[Mode, ...]:
        """Modes that are runs of their own."""
        return tuple(mode for mode in self.mode if mode.alternative)

    def seconds_to(self, moment: datetime) -> float:
        """True seconds from the start to a moment, leap seconds counted."""
        import numpy as np  # loads here, not for the schema

        from environments.timescales import elapsed_s

        first, last = (
            np.datetime64(when.replace(tzinfo=None), "ns") for when in (self.epoch, moment)
        )
        return float(elapsed_s(first, last))

    @property
    def epoch(self) -> datetime:
        """Start of the run, aware, UTC."""
        return self.orbit.epoch

    @property
    def duration_s(self) -> float:
        """Length of the run [s], wherever the file gives it."""
        hours = self.time.duration_h
        if hours is None and isinstance(self.orbit, OrbitFixed):
            hours = self.orbit.duration_h
        assert hours is not None  # check_case refused a case without
        return 3600.0 * hours

    @property
    def event_onset_s(self) -> tuple[float, ...]:
        """Begin of each plasma event [s] after the start; negative: before it."""
        return tuple(
            3600.0 * event.onset_h
            if event.onset_h is not None
            else self.seconds_to(event.onset or self.epoch)
            for event in self.plasma.event
        )

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the surfaces in the order of the file."""
        return tuple(surface.name for surface in self.surface)

    @property
    def output_times(self) -> int:
        """Number of output times: start + k·step, and the end."""
        steps = self.duration_s / self.time.output_step_s
        whole = math.floor(steps + 1e-9)  # 24 h in steps of 0.1 s must not gain one by rounding
        return whole + 1 + (steps - whole > 1e-9)
