"""The materials and plasmas that a case names: library entries, files beside it, kept texts."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from charging.case_errors import input_error
from charging.case_values import is_file, nearest_name
from charging.errors import InputError, KeyPath, Problem, ProblemsFound
from charging.toml_file import TomlFile, parse_toml, read_toml
from charging.units import plasma_bare_keys, rewrite_quantities

if TYPE_CHECKING:
    from environments.errors import EnvironmentDataError
    from environments.plasma import Plasma
    from materials.errors import MaterialError
    from materials.library import Material


@dataclass(frozen=True, slots=True)
class Sources:
    """Where the materials and plasmas of a case come from.

    Attributes
    ----------
    case_file : Path, optional
        The case; files are looked for in its folder. None: no files.
    allow_outside : bool
        Whether a file may lie outside that folder.
    material_texts, plasma_texts : mapping
        TOML texts that come before library and files.
    file_texts : mapping
        Texts of data files that come before files.
    file_sha256 : mapping
        SHA-256 of data files, also of those whose content was not kept.
    """

    case_file: Path | None = None
    allow_outside: bool = False
    material_texts: Mapping[str, str] = field(default_factory=dict)
    plasma_texts: Mapping[str, str] = field(default_factory=dict)
    file_texts: Mapping[str, str] = field(default_factory=dict)
    file_sha256: Mapping[str, str] = field(default_factory=dict)


def find_material(name: str, sources: Sources) -> tuple[Material, str]:
    """Return a material and its TOML text.

    Raises
    ------
    ProblemsFound
        The name or file cannot be found; the fault is in the case.
    InputError
        The file was found and cannot be used.
    """
    from charging.photo_level import levelled  # numpy loads here, not for the schema
    from materials.errors import MaterialError
    from materials.library import library_text, load_material, material_names, read_material

    toml = _toml("material", name, sources, sources.material_texts)
    if toml is None:
        try:
            return load_material(name), library_text(name)
        except MaterialError as error:
            near = error.nearest or nearest_name(name, material_names())
            raise _unknown(near, "All names: halflit materials") from None
    try:
        return levelled(read_material(toml.document)), toml.text
    except MaterialError as error:
        raise _in_file(error, toml, {}) from None


def find_plasma(name: str, sources: Sources, *, to_charge: bool = False) -> tuple[Plasma, str]:
    """Return a plasma and its TOML text; errors as `find_material`.

    `to_charge` True refuses one without electrons or without positive ions.
    """
    from environments.catalogue import library_text, load_plasma, plasma_names, read_plasma
    from environments.errors import EnvironmentDataError
    from environments.signs import refuse_one_sided

    toml = _toml("plasma", name, sources, sources.plasma_texts)
    if toml is None:
        try:
            return load_plasma(name), library_text(name)
        except EnvironmentDataError as error:
            near = error.nearest or nearest_name(name, plasma_names())
            raise _unknown(near, "All names: halflit plasmas") from None
    rewritten = rewrite_quantities(toml.document, plasma_bare_keys())
    if rewritten.problems:
        raise input_error(rewritten.problems, toml.document, file=toml.file, lines=toml.lines)
    try:
        plasma = read_plasma(rewritten.document, _folder(name, sources))
        if to_charge:
            refuse_one_sided(plasma)
        return plasma, _with_spectra(toml.text, plasma)
    except EnvironmentDataError as error:
        raise _in_file(error, toml, rewritten.origin) from None


def _folder(name: str, sources: Sources) -> Path | None:
    """Folder in which a plasma file may name spectra; None for a kept text."""
    if name in sources.plasma_texts or sources.case_file is None:
        return None
    return (sources.case_file.parent / name).resolve().parent


def _with_spectra(text: str, plasma: Plasma) -> str:
    """Text of a plasma with its spectrum files written out, so that it stands alone."""
    from environments.distributions import Tabulated

    pattern = re.compile(r"^[ \t]*spectrum_file[ \t]*=.*$", re.MULTILINE)
    inline = re.compile(r"^[ \t]*\[\[[ \t]*population[ \t]*\]\].*$", re.MULTILINE)
    head, *parts = inline.split(text)
    marks = inline.findall(text)
    if len(parts) != len(plasma.populations):  # written some other way: leave it
        return text
    for i, (part, population) in enumerate(zip(parts, plasma.populations, strict=True)):
        spectrum = population.distribution
        if isinstance(spectrum, Tabulated) and pattern.search(part):
            lists = (
                f"energy_eV = {list(spectrum.energy_eV)}\n"
                f"flux_m2_s_sr_eV = {list(spectrum.flux_m2_s_sr_eV)}"
            )
            parts[i] = pattern.sub(lists, part, count=1)
    return head + "".join(mark + part for mark, part in zip(marks, parts, strict=True))


def _toml(kind: str, name: str, sources: Sources, kept: Mapping[str, str]) -> TomlFile | None:
    """Return the text behind a name, or None for a name of the library."""
    if name in kept:
        return parse_toml(kept[name], file=f'{kind} "{name}"')
    if not is_file(name):
        return None
    real, path = located(name, sources)
    return read_toml(real, file=str(path))


def located(name: str, sources: Sources) -> tuple[Path, Path]:
    """Return the file that a case names: as it is on the disk, and as a message calls it.

    Raises
    ------
    ProblemsFound
        There is no such file, or it lies outside the folder of the case.
    """
    if sources.case_file is None:
        raise ProblemsFound([Problem((), "is a file whose text was not kept")])
    path = sources.case_file.parent / name
    try:
        folder = sources.case_file.resolve().parent
        real = (folder / name).resolve()
        inside = real.is_relative_to(folder)
        found = real.exists()
    except (OSError, RuntimeError, ValueError):  # a ring of links, a name too long
        raise ProblemsFound([Problem((), "is no usable path")]) from None
    if not inside and not sources.allow_outside:
        raise ProblemsFound(
            [
                Problem(
                    (),
                    "lies outside the folder of the case",
                    next_step="Copy it there, or permit it: --allow-outside",
                )
            ]
        )
    if not found:
        raise ProblemsFound([Problem((), "is a file that does not exist")])
    return real, path


def _unknown(nearest: str | None, next_step: str) -> ProblemsFound:
    return ProblemsFound([Problem((), "is unknown", nearest=nearest, next_step=next_step)])


def _in_file(
    error: MaterialError | EnvironmentDataError, toml: TomlFile, origin: Mapping[KeyPath, KeyPath]
) -> InputError:
    problem = Problem(
        error.key,
        error.problem,
        value=error.value,
        missing=error.value is None,
        allowed=error.allowed,
        nearest=error.nearest,
    )
    return input_error([problem], toml.document, file=toml.file, lines=toml.lines, origin=origin)
