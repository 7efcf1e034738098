"""Values and the common manner of the tables of a case file."""

from __future__ import annotations

from datetime import datetime
from typing import Annotated, Literal, TypeAlias

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, StringConstraints

from charging.case_checks import LONGEST_RUN_H
from charging.case_values import (
    NAME_PATTERN,
    csv_name,
    data_file,
    direction,
    free_text,
    reference,
    utc_time,
)

LONGEST_ORBIT_H = 20.0 * LONGEST_RUN_H
MOST_ENTRIES = 1000  # of one array; far beyond use

Name: TypeAlias = Annotated[str, StringConstraints(pattern=NAME_PATTERN)]
"""Name of a surface, mode, material or plasma; never used as a path."""
FreeText: TypeAlias = Annotated[str, AfterValidator(free_text)]
Reference: TypeAlias = Annotated[str, AfterValidator(reference)]
"""Library name, or a file when it ends in .toml or holds a slash."""
DataFile: TypeAlias = Annotated[str, AfterValidator(data_file)]
"""File of an orbit, inside the folder of the case."""
CsvFile: TypeAlias = Annotated[str, AfterValidator(csv_name)]
"""File ending in .csv, inside the folder of the case."""
Moment: TypeAlias = Annotated[datetime, AfterValidator(utc_time)]
"""Moment in UTC; the file must say Z or an offset."""
Direction: TypeAlias = Annotated[tuple[float, float, float], AfterValidator(direction)]
"""Unit vector along what was written; any length but zero is accepted."""
LimitKind: TypeAlias = Literal[
    "normal",
    "inverted",
    "field",
    "neighbour normal",
    "neighbour inverted",
    "neighbour",
    "energy",
    "structure",
]
"""What a limit bounds."""
Positive: TypeAlias = Annotated[float, Field(gt=0.0)]
Share: TypeAlias = Annotated[float, Field(ge=0.0, le=1.0)]
Angle: TypeAlias = Annotated[float, Field(ge=-360.0, le=360.0)]
Temperature: TypeAlias = Annotated[float, Field(ge=50.0, le=2000.0)]
"""Of a surface [K]; below 50 K the conduction law is refused."""
SolarActivity: TypeAlias = Annotated[float, Field(ge=50.0, le=500.0)]


class Table(BaseModel):
    """Common manner of every table: strict types, no unknown keys, no nan or inf, frozen."""

    model_config = ConfigDict(strict=True, frozen=True, extra="forbid", allow_inf_nan=False)
