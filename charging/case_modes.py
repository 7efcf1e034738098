"""What changes during a run: the tables [[mode]] and [[emitter]] of a case."""

from __future__ import annotations

from typing import Literal, Self

from pydantic import Field, model_validator

from charging.case_mode_checks import check_emitter, check_mode
from charging.case_orbit import Attitude
from charging.case_types import (
    MOST_ENTRIES,
    Direction,
    Moment,
    Name,
    Reference,
    Share,
    SolarActivity,
    Table,
)


class Span(Table):
    """Begin and end, each as a moment or in hours from the start of the run."""

    begin: Moment | None = Field(default=None, alias="from", description="UTC with Z")
    end: Moment | None = Field(default=None, alias="to", description="UTC with Z")
    from_h: float | None = Field(default=None, ge=0.0, description="begin, hours from the start")
    to_h: float | None = Field(default=None, gt=0.0, description="end, hours from the start")


class Mode(Span):
    """What differs from the case over an interval, or in a whole run of its own."""

    name: Name
    alternative: bool = Field(
        default=False, description="a whole run of its own, instead of an interval"
    )
    attitude: Attitude | None = None
    array: Literal["tracking", "parked"] | None = Field(
        default=None, description="state of the surfaces with tracks_sun"
    )
    parked_sun_angle_deg: float | None = Field(
        default=None,
        ge=-180.0,
        le=180.0,
        description="parked: turned away from where it would track the Sun",
    )
    parked_normal: Direction | None = Field(
        default=None, description="parked: normal of the front, fixed to the body"
    )
    plasma: Reference | None = None
    events: bool = Field(default=True, description="false drops the plasma events")
    emitters: tuple[Name, ...] | None = Field(
        default=None, max_length=MOST_ENTRIES, description="those that work; [] for none"
    )
    illumination: Share | None = Field(default=None, description="fixed orbits only")
    sun_direction: Direction | None = Field(default=None, description="fixed orbits only")
    f107: SolarActivity | None = Field(default=None, description="alternative = true only")

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_mode(self)
        return self


class Emitter(Span):
    """A source on structure that sends electrons of one energy into the plasma, or a clamp."""

    name: Name
    current_A: float = Field(
        gt=0.0, le=100.0, description="electrons sent out; positive charge arrives on structure"
    )
    energy_eV: float = Field(
        gt=0.0,
        le=1e5,
        description="none leaves once structure stands above this many volts",
    )
    below_V: float | None = Field(
        default=None,
        ge=-1e5,
        le=1e5,
        description="on demand: works while structure stands below; default: always",
    )
    hold_V: float | None = Field(
        default=None,
        ge=-1e5,
        le=1e5,
        description="a clamp: holds structure here by a current of either sign, up to current_A",
    )

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        check_emitter(self)
        return self
