"""The tables [[shape]] of a case: bodies of which the spacecraft is made, and their faces."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Annotated, Literal, Self, TypeAlias

from pydantic import Field, model_validator

from charging.case_checks import MOST_PROBLEMS
from charging.case_types import Direction, Name, Positive, Table
from charging.case_values import nearest_name, quoted
from charging.errors import Problem, ProblemsFound

if TYPE_CHECKING:
    from charging.case_tables import Case

Place: TypeAlias = tuple[
    Annotated[float, Field(ge=-1000.0, le=1000.0)],
    Annotated[float, Field(ge=-1000.0, le=1000.0)],
    Annotated[float, Field(ge=-1000.0, le=1000.0)],
]
Length: TypeAlias = Annotated[float, Field(gt=0.0, le=1000.0)]

KEYS: Mapping[str, tuple[str, ...]] = {
    "block": ("size_m",),
    "panel": ("size_m", "thickness_m"),
    "tube": ("radius_m", "length_m"),
    "ring plate": ("radius_m", "inner_radius_m", "thickness_m"),
    "paraboloid": ("radius_m", "depth_m", "thickness_m"),
    "ball": ("radius_m",),
}
"""Measures that a kind of shape needs; a ball may also have `cap_half_angle_deg`."""

FACES: Mapping[str, tuple[str, ...]] = {
    "block": ("+x", "-x", "+y", "-y", "+z", "-z"),
    "panel": ("front", "back", "edge"),
    "tube": ("-z", "side", "+z"),
    "ring plate": ("back", "outer edge", "front", "inner edge"),
    "paraboloid": ("back", "edge", "front"),
    "ball": ("rest", "cap"),
}
"""Faces of a kind of shape, in its own axes; front looks along the shape's own +z."""

_MEASURES = (
    "size_m", "thickness_m", "radius_m", "inner_radius_m", "length_m", "depth_m",
    "cap_half_angle_deg",
)  # fmt: skip
MOST_SHAPES = 60
THINNEST = 1e-4
"""Least ratio of two measures of one shape."""


class Shape(Table):
    """A body: placed and turned in body axes, or turning with the Sun about body y."""

    name: Name
    kind: Literal["block", "panel", "tube", "ring plate", "paraboloid", "ball"]
    center_m: Place = Field(
        default=(0.0, 0.0, 0.0), description="body axes; of a paraboloid: the vertex of its front"
    )
    axis: Direction | None = Field(
        default=None, description="of its own +z in body axes; default [0, 0, 1]"
    )
    along: Direction | None = Field(
        default=None, description="of its own +x in body axes; default: nearest to body x"
    )
    tracks_sun: bool = Field(
        default=False, description="turns about body y through its center, front to the Sun"
    )
    size_m: tuple[Length, ...] | None = Field(
        default=None, min_length=2, max_length=3, description="block: three; panel: two"
    )
    thickness_m: Positive | None = None
    radius_m: Length | None = None
    inner_radius_m: Length | None = None
    length_m: Length | None = None
    depth_m: Length | None = None
    cap_half_angle_deg: float | None = Field(
        default=None, gt=0.0, lt=180.0, description="of a ball: a cap about its own +z as a face"
    )

    @model_validator(mode="after")
    def _consistent(self) -> Self:
        found = list(_shape_problems(self))
        if found:
            raise ProblemsFound(found)
        return self

    @property
    def faces(self) -> tuple[str, ...]:
        """Names of the faces."""
        if self.kind == "ball" and self.cap_half_angle_deg is None:
            return ("whole",)
        return FACES[self.kind]


def _shape_problems(shape: Shape) -> Iterator[Problem]:
    needed = KEYS[shape.kind]
    may = (*needed, "cap_half_angle_deg") if shape.kind == "ball" else needed
    for key in _MEASURES:
        value = getattr(shape, key)
        if value is not None and key not in may:
            yield Problem(
                (key,),
                f"does not go with kind = {quoted([shape.kind])}",
                value=list(value) if isinstance(value, tuple) else value,
                allowed=", ".join(may),
            )
        elif value is None and key in needed:
            message = f"is missing for kind = {quoted([shape.kind])}"
            yield Problem((key,), message, missing=True, allowed="metres above 0")
    due = {"block": 3, "panel": 2}.get(shape.kind)
    if due is not None and shape.size_m is not None and len(shape.size_m) != due:
        words = "three lengths" if due == 3 else "two lengths, and thickness_m"
        message = f"has {len(shape.size_m)} entries"
        yield Problem(("size_m",), message, value=list(shape.size_m), allowed=words)
    if shape.tracks_sun and (shape.axis is not None or shape.along is not None):
        key = "axis" if shape.axis is not None else "along"
        yield Problem(
            (key,),
            "stands beside tracks_sun, which turns the shape",
            value=list(getattr(shape, key)),
        )
    if shape.tracks_sun and shape.kind != "panel":
        allowed = 'kind = "panel"'
        yield Problem(("tracks_sun",), "goes only with a panel", value=True, allowed=allowed)
    yield from _flat_problems(shape)


def _flat_problems(shape: Shape) -> Iterator[Problem]:
    """Yield measures that turn a body inside out or leave nothing of it."""
    if (
        shape.inner_radius_m is not None
        and shape.radius_m is not None
        and shape.inner_radius_m >= shape.radius_m
    ):
        yield Problem(
            ("inner_radius_m",),
            "turns the ring inside out",
            value=shape.inner_radius_m,
            allowed=f"below radius_m = {shape.radius_m:g}",
        )
        return
    if shape.axis is not None and shape.along is not None:
        cosine = sum(a * b for a, b in zip(shape.axis, shape.along, strict=True))
        if abs(cosine) > 1e-6:
            yield Problem(("along",), "is not square to axis", value=list(shape.along))
    measures = [
        (key, one)
        for key in _MEASURES[:-1]
        if (value := getattr(shape, key)) is not None
        for one in (value if isinstance(value, tuple) else (value,))
    ]
    if shape.inner_radius_m is not None and shape.radius_m is not None:
        measures.append(("inner_radius_m", shape.radius_m - shape.inner_radius_m))
    if measures:
        most = max(one for _, one in measures)
        key, least = min(measures, key=lambda pair: pair[1])
        if least < THINNEST * most:
            yield Problem(
                (key,),
                f"leaves a degenerate shape, {most / least:.3g} times as large as thick",
                value=getattr(shape, key),
                allowed=f"at least {THINNEST * most:.3g} beside {most:g}",
            )


def face_names(case: Case) -> tuple[str, ...]:
    """All faces of a case as surfaces name them, ``shape.face``."""
    return tuple(f"{shape.name}.{face}" for shape in case.shape for face in shape.faces)


def check_shapes(case: Case) -> None:
    """Refuse shapes and surfaces whose names contradict each other."""
    found = list(_case_problems(case))
    if found:
        raise ProblemsFound(found[:MOST_PROBLEMS])


def _case_problems(case: Case) -> Iterator[Problem]:
    """Yield contradictions between shapes, surfaces and faces, as far as names tell."""
    names = [shape.name for shape in case.shape]
    for index, name in enumerate(names):
        if name in names[:index]:
            first = names.index(name) + 1
            message = f"is the name of shape {first} already"
            yield Problem(("shape", index, "name"), message, value=name)
    known = face_names(case)
    owner: dict[str, str] = {}
    for index, surface in enumerate(case.surface):
        if not case.shape:
            if surface.lies_on:
                given = "face" if surface.face is not None else "faces"
                message = "needs a [[shape]] that has it"
                yield Problem(("surface", index, given), message, value=surface.lies_on[0])
            continue
        if not surface.lies_on:
            yield Problem(
                ("surface", index, "face"),
                "is missing; in a case with [[shape]] every surface lies on faces",
                missing=True,
                allowed=_some(known),
            )
            continue
        for place, face in enumerate(surface.lies_on):
            key = ("surface", index, *(("faces", place) if surface.face is None else ("face",)))
            if face not in known:
                yield Problem(
                    key,
                    "is no face of a shape",
                    value=face,
                    nearest=nearest_name(face, known),
                    allowed=_some(known),
                )
            elif face in owner:
                yield Problem(key, f'belongs to surface "{owner[face]}" already', value=face)
            owner.setdefault(face, surface.name)


def _some(names: tuple[str, ...]) -> str:
    return quoted(names[:12]) + (" and more" if len(names) > 12 else "")
