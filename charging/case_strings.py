"""Strings of solar cells and dose rates: the tables [[string]] and [radiation] of a case."""

from __future__ import annotations

from typing import Annotated, Literal, Self, TypeAlias

from pydantic import Field, model_validator

from charging.case_types import Name, Reference, Table
from charging.errors import Problem, ProblemsFound

Reach: TypeAlias = Annotated[float, Field(ge=-1e4, le=1e4)]
Place: TypeAlias = tuple[Reach, Reach, Reach]
DoseRate: TypeAlias = Annotated[float, Field(ge=0.0, le=1e6)]


class ArrayString(Table):
    """Exposed conductors of a solar array, whose potential rises along the string."""

    name: Name
    surface: Name = Field(description="surface of the array's front: its light, ram and area")
    material: Reference = Field(description="of the exposed conductors: library name or file")
    exposed_share: float = Field(
        gt=0.0, le=1.0, description="exposed conductor over the area of the surface"
    )
    voltage_V: float = Field(
        gt=0.0, le=2000.0, description="from end to end, while light falls on the surface"
    )
    grounded: Literal["negative", "positive"] = Field(
        default="negative", description="end that is on structure"
    )
    negative_end_m: Place | None = Field(
        default=None,
        description="where the end stands from the middle of structure, body axes, for v x B . L",
    )
    positive_end_m: Place | None = Field(default=None, description="likewise")

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        ends = (("negative_end_m", self.negative_end_m), ("positive_end_m", self.positive_end_m))
        for (key, value), (other, given) in (ends, ends[::-1]):
            if value is None and given is not None:
                allowed = f"beside {other}: three lengths in body axes"
                raise ProblemsFound([Problem((key,), "is missing", missing=True, allowed=allowed)])
        return self


class Radiation(Table):
    """Dose rate in the dielectrics, which raises their conductivity."""

    dose_rate_rad_s: DoseRate = Field(
        default=0.0, description="in the depth of the films; 0: dark conductivity alone"
    )
    by_region: dict[str, DoseRate] = Field(
        default_factory=dict, description="rad/s by region of space, with model = regions"
    )


NO_RADIATION = Radiation()
