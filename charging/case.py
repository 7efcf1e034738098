"""Case files: one TOML file, read and checked, with the materials and plasmas it names.

:func:`load_case` is the only way from a file to the objects of a run. Nothing wrong in a file
leaves it but :class:`charging.errors.InputError`, which names file, line, key and value.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, fields, replace
from functools import partial
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any, TypeVar

from pydantic import ValidationError

from charging.case_checks import check_case
from charging.case_errors import input_error, problems_of
from charging.case_files import NO_FILES, CaseFiles, read_files
from charging.case_library import Sources, find_material, find_plasma
from charging.case_modes import Emitter, Mode
from charging.case_orbit import Attitude, OrbitFile, OrbitFixed, OrbitKepler
from charging.case_plasma import PlasmaEvent, PlasmaSubstorm, PlasmaTable
from charging.case_shape import Shape
from charging.case_tables import (
    Body,
    Case,
    Emission,
    Limit,
    Link,
    MarginPolicy,
    Review,
    Sun,
    SunlitEclipse,
    Surface,
    Time,
)
from charging.errors import KeyPath, Problem, ProblemsFound
from charging.toml_file import TomlFile, parse_toml, read_toml
from charging.units import case_bare_keys, rewrite_quantities
from materials.errors import MaterialError
from materials.surface_state import in_state, records_of_state

if TYPE_CHECKING:
    from environments.plasma import Plasma
    from materials.library import Material

__all__ = [
    "Attitude",
    "Body",
    "Case",
    "CaseFiles",
    "Emission",
    "Emitter",
    "Limit",
    "Link",
    "LoadedCase",
    "MarginPolicy",
    "Mode",
    "OrbitFile",
    "OrbitFixed",
    "OrbitKepler",
    "PlasmaEvent",
    "PlasmaSubstorm",
    "PlasmaTable",
    "Review",
    "Shape",
    "Sun",
    "SunlitEclipse",
    "Surface",
    "Time",
    "case_schema",
    "changed_case",
    "load_case",
    "load_case_text",
]

T = TypeVar("T")
_LAYER_PROPERTIES = ("relative_permittivity", "bulk_resistivity_ohm_m", "activation_energy_eV")


@dataclass(frozen=True, slots=True)
class LoadedCase:
    """A case with everything it names.

    Attributes
    ----------
    case : Case
        The checked tables.
    path : Path
        The file as named by the person.
    text, sha256 : str
        Its text, and the SHA-256 of its bytes in hexadecimal.
    materials, plasmas : mapping
        Material or plasma by the text that names it in the case; also, by their library
        names, the materials whose curves the surface states need.
    material_texts, plasma_texts : mapping
        Their TOML texts by the same keys: with them the case can be run again.
    files : CaseFiles
        Contents and texts of the data files.
    """

    case: Case
    path: Path
    text: str
    sha256: str
    materials: Mapping[str, Material]
    material_texts: Mapping[str, str]
    plasmas: Mapping[str, Plasma]
    plasma_texts: Mapping[str, str]
    files: CaseFiles = NO_FILES

    def __reduce__(self) -> tuple[type[LoadedCase], tuple[object, ...]]:
        # read-only views cannot be pickled; what they show can
        values = (getattr(self, entry.name) for entry in fields(self))
        return LoadedCase, tuple(dict(v) if isinstance(v, Mapping) else v for v in values)


def load_case(
    path: str | Path, *, allow_outside: bool = False, orbit_only: bool = False
) -> LoadedCase:
    """Read a case file and the materials and plasmas it names.

    Parameters
    ----------
    path : str or Path
        The case file, up to 1 MB of UTF-8 TOML.
    allow_outside : bool, optional
        Whether the case may name files outside its own folder (links are followed first).
    orbit_only : bool, optional
        The case is for its orbit alone: the bounds on length and output times of a run do not
        hold.

    Returns
    -------
    LoadedCase
        Frozen.

    Raises
    ------
    InputError
        Anything that cannot be used, with file, line, key, value and what is allowed.
    """
    path = Path(path)
    toml = read_toml(path, absent="A commented case to start from: halflit case new --out FILE")
    return _loaded(toml, path, Sources(path, allow_outside), orbit_only)


def load_case_text(
    text: str,
    *,
    file: str = "case.toml",
    material_texts: Mapping[str, str] | None = None,
    plasma_texts: Mapping[str, str] | None = None,
    file_texts: Mapping[str, str] | None = None,
    file_sha256: Mapping[str, str] | None = None,
) -> LoadedCase:
    """Return a case from its text, as a result file keeps it.

    Parameters
    ----------
    text : str
        TOML text of the case.
    file : str, optional
        How messages call it.
    material_texts, plasma_texts : mapping, optional
        TOML texts by the text that names them in the case; what is not in them is a library name.
    file_texts, file_sha256 : mapping, optional
        Texts of the data files by name, and the SHA-256 of all of them.

    Raises
    ------
    InputError
        As `load_case`; also when the case names a file that is not among the texts.
    """
    sources = Sources(
        material_texts=material_texts or {},
        plasma_texts=plasma_texts or {},
        file_texts=file_texts or {},
        file_sha256=file_sha256 or {},
    )
    return _loaded(parse_toml(text, file=file), Path(file), sources)


def changed_case(
    loaded: LoadedCase, edits: Mapping[KeyPath, object], *, allow_outside: bool = False
) -> LoadedCase:
    """Return a case with some keys of its file set to other values, checked like a file.

    Parameters
    ----------
    loaded : LoadedCase
    edits : mapping of key path to value
        ``("surface", 2, "material"): "gold"``; None takes the key out.
    allow_outside : bool, optional
        As in `load_case`.

    Returns
    -------
    LoadedCase
        Its text stays that of the file.

    Raises
    ------
    InputError
        As `load_case`; lines are those of the file.
    """
    toml = parse_toml(loaded.text, file=str(loaded.path))
    for path, value in edits.items():
        table: Any = toml.document
        for part in path[:-1]:
            table = table.setdefault(part, {}) if isinstance(part, str) else table[part]
        if value is None:
            table.pop(path[-1], None)
        else:
            table[path[-1]] = value
    sources = Sources(
        loaded.path if loaded.path.is_file() else None,
        allow_outside,
        material_texts=loaded.material_texts,
        plasma_texts=loaded.plasma_texts,
    )
    return _loaded(toml, loaded.path, sources)


def case_schema() -> dict[str, Any]:
    """Return the JSON schema of a case file (keys with units; checks between keys not included).

    Examples
    --------
    >>> sorted(case_schema()["required"])
    ['body', 'orbit', 'plasma', 'surface', 'title']
    """
    return Case.model_json_schema()


def _loaded(toml: TomlFile, path: Path, sources: Sources, orbit_only: bool = False) -> LoadedCase:
    case, origin = _checked(toml, orbit_only)
    files = NO_FILES
    try:
        case, files, problems = read_files(case, sources)
        if not problems:
            check_case(case, orbit_only=orbit_only)
        if not problems and case.shape and not orbit_only:
            from charging.shape.reading import with_faces  # numpy loads for cases with shapes

            case, problems = with_faces(case)
    except ProblemsFound as error:
        problems = list(error.problems)
    materials = _found(_materials_named(case), find_material, sources, problems)
    plasmas = _found(
        _plasmas_named(case), partial(find_plasma, to_charge=not orbit_only), sources, problems
    )
    if not problems:
        named = {name: found[0] for name, found in materials.items()}
        problems += [*_layer_problems(case, named), *_state_problems(case, named)]
        if case.string or case.radiation.by_region or case.radiation.dose_rate_rad_s:
            from charging.array_strings import array_problems  # numpy loads for these cases

            problems += array_problems(case, named)
        # states take curves of other records: a run repeated from its result needs those too
        needed = (
            (("surface", index, "surface_state"), other)
            for index, surface in enumerate(case.surface)
            for other in records_of_state(named[surface.material], surface.surface_state)
        )
        materials |= _found(
            ((key, name) for key, name in needed if name not in materials),
            find_material,
            sources,
            problems,
        )
    if problems:
        raise input_error(problems, toml.document, file=toml.file, lines=toml.lines, origin=origin)
    return LoadedCase(
        case=case,
        path=path,
        text=toml.text,
        sha256=hashlib.sha256(toml.text.encode("utf-8")).hexdigest(),
        materials=MappingProxyType({name: found[0] for name, found in materials.items()}),
        material_texts=MappingProxyType({name: found[1] for name, found in materials.items()}),
        plasmas=MappingProxyType({name: found[0] for name, found in plasmas.items()}),
        plasma_texts=MappingProxyType({name: found[1] for name, found in plasmas.items()}),
        files=files,
    )


def _found(
    named: Iterable[tuple[KeyPath, str]],
    find: Callable[[str, Sources], tuple[T, str]],
    sources: Sources,
    problems: list[Problem],
) -> dict[str, tuple[T, str]]:
    """Return what the names stand for; add those that stand for nothing to `problems`."""
    found: dict[str, tuple[T, str]] = {}
    for key, name in named:
        if name in found:
            continue
        try:
            found[name] = find(name, sources)
        except ProblemsFound as error:
            problems += [replace(fault, key=key, value=name) for fault in error.problems]
    return found


def _checked(toml: TomlFile, orbit_only: bool) -> tuple[Case, Mapping[KeyPath, KeyPath]]:
    """Return the case of a document, and which of its keys stand in the file as bare ones."""
    rewritten = rewrite_quantities(toml.document, case_bare_keys())
    problems = list(rewritten.problems)
    case = None
    try:
        case = Case.model_validate(rewritten.document, context={"orbit_only": orbit_only})
    except ValidationError as error:
        problems += [
            problem
            for problem in problems_of(error, rewritten.document)
            if problem.key not in rewritten.absent
        ]
    if case is None or problems:
        raise input_error(
            problems, toml.document, file=toml.file, lines=toml.lines, origin=rewritten.origin
        )
    return case, rewritten.origin


def _materials_named(case: Case) -> Iterator[tuple[KeyPath, str]]:
    for index, surface in enumerate(case.surface):
        yield ("surface", index, "material"), surface.material
    for index, string in enumerate(case.string):
        yield ("string", index, "material"), string.material


def _plasmas_named(case: Case) -> Iterator[tuple[KeyPath, str]]:
    if case.plasma.use is not None:
        yield ("plasma", "use"), case.plasma.use
    if case.plasma.arc is not None:
        yield ("plasma", "arc"), case.plasma.arc
    for index, event in enumerate(case.plasma.event):
        yield ("plasma", "event", index, "use"), event.use
    for index, mode in enumerate(case.mode):
        if mode.plasma is not None:
            yield ("mode", index, "plasma"), mode.plasma
    for index, name in enumerate(case.review.plasmas):
        yield ("review", "plasmas", index), name


def _state_problems(case: Case, materials: Mapping[str, Material]) -> Iterator[Problem]:
    """Yield surfaces whose material has no record of the state they ask for."""
    for index, surface in enumerate(case.surface):
        try:
            in_state(materials[surface.material], surface.surface_state)
        except MaterialError as error:
            yield Problem(
                ("surface", index, "surface_state"),
                error.problem,
                value=surface.surface_state,
                allowed=error.allowed,
            )


def _layer_problems(case: Case, materials: Mapping[str, Material]) -> Iterator[Problem]:
    """Yield surfaces whose material does not go with having, or not having, a thickness."""
    for index, surface in enumerate(case.surface):
        material = materials[surface.material]
        if material.kind == "dielectric" and surface.thickness_m is None:
            yield Problem(
                ("surface", index, "thickness_m"),
                f'is missing; its material "{material.name}" is a dielectric',
                missing=True,
                allowed="metres above 0",
            )
        elif material.kind == "conductor" and surface.thickness_m is not None:
            yield Problem(
                ("surface", index, "thickness_m"),
                f'does not go with its material "{material.name}", a conductor',
                value=surface.thickness_m,
                next_step="Leave it out.",
            )
        elif surface.thickness_m is not None:
            lacking = [name for name in _LAYER_PROPERTIES if name not in material.values]
            if lacking:
                yield Problem(
                    ("surface", index, "material"),
                    f"has no {' and no '.join(lacking)}, which a surface with thickness_m needs",
                    value=surface.material,
                )
