"""Where everything that a review used comes from: values, plasmas, laws, code, hashes."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Sequence
from functools import cache
from importlib import metadata, resources
from importlib.resources.abc import Traversable
from typing import Any

from charging import __version__
from charging.case import LoadedCase
from charging.currents.emission import backscatter_law, law_of
from charging.orbit_run import laws_of
from charging.review.limits import Requirement
from charging.review.nominal import Cell
from charging.review.scenes import AGES
from charging.review.space import material_in_state, state_at
from environments.plasma import electron_to_ion_current_ratio
from environments.spectrum import spectrum_sources
from materials.record import PROPERTIES, Material
from materials.secondary import LAW_FACTS

BACKSCATTER_SOURCES = {
    "prokopenko_laframboise_1980": "Prokopenko & Laframboise 1980, J. Geophys. Res. 85, 4125",
    "hunger_kuchler_1979": "Hunger & Küchler 1979, Phys. Status Solidi A 56, K45",
}
PACKAGES = ("numpy", "scipy", "xarray", "netCDF4", "matplotlib", "pydantic")
ROOMS = ("charging", "environments", "materials")


@cache
def code_sha256() -> str:
    """SHA-256 over all modules and data files of the three packages, in order of their paths."""
    total = hashlib.sha256()
    for room in ROOMS:
        files: list[tuple[str, bytes]] = []
        stack: list[tuple[str, Traversable]] = [(room, resources.files(room))]
        while stack:
            path, entry = stack.pop()
            for child in entry.iterdir():
                place = f"{path}/{child.name}"
                if child.is_dir():
                    stack.append((place, child))
                elif child.name.endswith((".py", ".toml")):
                    files.append((place, child.read_bytes()))
        for place, content in sorted(files):
            total.update(f"{place}\0{len(content)}\0".encode())
            total.update(content)
    return total.hexdigest()


def hashes(loaded: LoadedCase) -> dict[str, Any]:
    """Hashes of case, materials, plasmas, data files and code."""

    def of(texts: Any) -> dict[str, str]:
        return {name: hashlib.sha256(text.encode()).hexdigest() for name, text in texts.items()}

    return {
        "case": loaded.sha256,
        "materials": of(loaded.material_texts),
        "plasmas": of(loaded.plasma_texts),
        "files": dict(loaded.files.sha256),
        "code": code_sha256(),
    }


def run_hash(loaded: LoadedCase, settings: dict[str, Any]) -> str:
    """One hash of everything that determines the numbers of a review."""
    total = hashlib.sha256()
    for entry in (hashes(loaded), settings):
        total.update(repr(entry).encode())
    return total.hexdigest()


def versions() -> dict[str, str]:
    """Versions of the program, Python and the packages that its numbers pass through."""
    found = {"halflit": __version__, "python": platform.python_version()}
    for name in PACKAGES:
        found[name] = metadata.version(name)
    return found


def property_rows(loaded: LoadedCase) -> list[dict[str, Any]]:
    """Every property of every material of the case, with source, basis, spread and users."""
    rows: list[dict[str, Any]] = []
    used: dict[str, list[str]] = {}
    for surface in loaded.case.surface:
        used.setdefault(surface.material, []).append(surface.name)
    for name, surfaces in used.items():
        material = loaded.materials[name]
        for key, record in material.values.items():
            rows.append(
                {
                    "material": material.name,
                    "surfaces": surfaces,
                    "property": key,
                    "meaning": PROPERTIES[key].meaning,
                    "value": record.value,
                    "unit": PROPERTIES[key].unit,
                    "spread": [record.spread.low, record.spread.high],
                    "spread_law": record.spread.law,
                    "basis": record.basis,
                    "source": record.source or None,
                    "measurement_method": record.measurement_method,
                }
            )
        rows += _photoyield_rows(loaded, name, material, surfaces)
    return rows


def _photoyield_rows(
    loaded: LoadedCase, name: str, material: Material, surfaces: list[str]
) -> list[dict[str, Any]]:
    states: dict[str, list[str]] = {}
    for age in loaded.case.review.ages:
        for surface in loaded.case.surface:
            if surface.material == name:
                state = state_at(surface.surface_state, age)
                ages = states.setdefault(state, [])
                if AGES[age] not in ages:
                    ages.append(AGES[age])
    rows = []
    for state, ages in states.items():
        curve = material_in_state(loaded, name, state).photoyield
        if curve is None:
            continue
        rows.append(
            {
                "material": material.name,
                "surfaces": surfaces,
                "property": f"photoyield, {state}",
                "meaning": f"electrons per photon; {', '.join(ages)}; level {curve.level}",
                "value": curve.threshold_eV,
                "unit": "eV (threshold)",
                "spread": [1.0 / curve.spread_factor, curve.spread_factor],
                "spread_law": "factor on the level, log_uniform",
                "basis": curve.basis,
                "source": curve.source or None,
                "measurement_method": None,
            }
        )
    return rows


def plasma_rows(cells: Sequence[Cell]) -> list[dict[str, Any]]:
    """Every plasma of the review with source, clause, basis and populations."""
    return [
        {
            "plasma": plasma.name,
            "title": plasma.title,
            "source": plasma.source or None,
            "clause": plasma.clause,
            "basis": plasma.basis,
            "note": plasma.note,
            "electron_to_ion_current_ratio": _ratio(plasma),
            "populations": [
                {
                    "species": p.species.name,
                    "law": p.law,
                    "density_m3": p.density_m3,
                    "temperature_eV": p.temperature_eV,
                }
                for p in plasma.populations
            ],
        }
        for plasma in dict.fromkeys(p for cell in cells for p in cell.run.whole_plasmas)
    ]


def _ratio(plasma: Any) -> float | None:
    import math

    value = float(electron_to_ion_current_ratio(plasma))
    return value if math.isfinite(value) else None


def references(
    loaded: LoadedCase, cells: Sequence[Cell], limits: Sequence[Requirement]
) -> list[dict[str, str]]:
    """Sources of exactly what this review used: laws, spectrum, values, plasmas, limits."""
    found: dict[tuple[str, str], None] = {}

    def cite(what: str, source: str) -> None:
        found.setdefault((what, source))

    emitting = [
        loaded.materials[s.material]
        for s in loaded.case.surface
        if loaded.materials[s.material].emits
    ]
    for material in emitting:
        for law in laws_of(loaded):
            chosen = law_of(material, law)
            cite(f"secondary electrons, {chosen}", LAW_FACTS[chosen].source)
        law_name = backscatter_law(material)
        cite(f"backscattered electrons, {law_name}", BACKSCATTER_SOURCES[law_name])
    if emitting:
        cite("electrons released by ions", "Whipple 1981, Rep. Prog. Phys. 44, 1197 (memory)")
    if any(s.thickness_m is not None for s in loaded.case.surface):
        cite(
            "conduction at high fields",
            "Adamec & Calderwood 1981, J. Phys. D: Appl. Phys. 14, 1487 (memory)",
        )
    cite("attracted particles", "Mott-Smith & Langmuir 1926, Phys. Rev. 28, 727 (memory)")
    if any("auto" in v.collection for cell in cells for v in cell.variants):
        cite(
            "sheath length",
            "Lieberman & Lichtenberg 2005, Principles of Plasma Discharges, sec. 6.3 (memory)",
        )
    if _lit(cells) and any(m.photoyield is not None for m in emitting):
        for part, source in spectrum_sources().items():
            cite(f"solar spectrum, {part}", source)
    cite(
        "time march",
        "Hairer & Wanner 1996, Solving Ordinary Differential Equations II, sec. IV.7 (memory)",
    )
    for row in property_rows(loaded):
        if row["source"]:
            cite(f"{row['material']}: {row['property']}", row["source"])
    for plasma in plasma_rows(cells):
        if plasma["source"]:
            cite(f"plasma: {plasma['plasma']}", plasma["source"])
    for cell in cells:
        along = cell.run.around.along
        for one in () if along is None else along.sampled.populations:
            cite(f"plasma along the orbit: {one.label}", one.source)
        if cell.run.way.trajectory is not None:
            cite("orbit", cell.run.way.trajectory.source)
    for limit in limits:
        issue = f" ({limit.issue})" if limit.issue else ""
        clause = f", {limit.clause}" if limit.clause else ""
        read = "" if limit.verified else "; text not read"
        cite(f"limit: {limit.kind}", f"{limit.document}{issue}{clause}{read}")
    return [{"what": what, "source": source} for what, source in found]


def _lit(cells: Sequence[Cell]) -> bool:
    return any(bool((cell.run.around.table[:, -1] > 0.0).any()) for cell in cells)
