"""Changes to a design, and a case with them applied."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from types import MappingProxyType
from typing import Any, Literal

from charging.case import Case, Link, LoadedCase, Surface
from charging.case_checks import check_case
from materials.library import library_text, load_material
from materials.record import Material, Spread

ChangeKey = Literal["bulk_resistivity_ohm_m", "thickness_m", "material", "link", "bond"]

PROPOSED = "largest value that this review found to keep the limits; a requirement, no measurement"


@dataclass(frozen=True, slots=True)
class Change:
    """One change of one surface.

    key : "bulk_resistivity_ohm_m" (largest, spread included), "thickness_m", "material" (of the
    library), "link" (a bleed resistor to structure [ohm]) or "bond" (part of structure).
    bonds : the surface loses its own node.
    """

    surface: str
    key: ChangeKey
    value: float | str
    bonds: bool = False

    @property
    def text(self) -> str:
        """The change in words."""
        if self.key == "bulk_resistivity_ohm_m":
            return f"bulk resistivity of '{self.surface}' at most {self.value:.3g} ohm m"
        if self.key == "thickness_m":
            return f"thickness of '{self.surface}' {1e6 * float(self.value):.3g} µm"
        if self.key == "material":
            how = ", bonded to structure, no film" if self.bonds else ""
            return f"'{self.surface}' made of {self.value}{how}"
        if self.key == "link":
            return f"bleed resistor of {self.value:.3g} ohm from '{self.surface}' to structure"
        return f"'{self.surface}' bonded to structure"

    def document(self) -> dict[str, Any]:
        """The change as JSON."""
        return {
            "surface": self.surface,
            "key": self.key,
            "value": self.value,
            "bonded": self.bonds,
            "text": self.text,
        }


Design = tuple[Change, ...]


def limited_name(material: str, resistivity_ohm_m: float) -> str:
    """Name of a material whose resistivity is held below a bound."""
    return f"{material} below {resistivity_ohm_m:.6g} ohm m"


def designed(loaded: LoadedCase, design: Sequence[Change]) -> LoadedCase:
    """Apply changes to a case.

    Its text stays that of the file: what is proposed is told by the changes.

    Raises
    ------
    ProblemsFound
        The changed case contradicts itself.
    """
    case = loaded.case
    surfaces = {surface.name: surface for surface in case.surface}
    links = list(case.link)
    materials, texts = dict(loaded.materials), dict(loaded.material_texts)
    for change in design:
        surface = surfaces[change.surface]
        updated: dict[str, Any] = {}
        if change.key == "bulk_resistivity_ohm_m":
            name = limited_name(surface.material, float(change.value))
            materials[name] = _limited(materials[surface.material], float(change.value))
            texts.setdefault(name, texts.get(surface.material, ""))
            updated = {"material": name}
        elif change.key == "thickness_m":
            updated = {"thickness_m": float(change.value)}
        elif change.key == "material":
            name = str(change.value)
            if name not in materials:
                materials[name], texts[name] = load_material(name), library_text(name)
            updated = {"material": name, "surface_state": "as recorded"}
            if change.bonds:
                updated |= {"thickness_m": None, "floating": False, "capacitance_F": None}
        elif change.key == "link":
            between = (change.surface, Case.STRUCTURE)
            links.append(Link(between=between, resistance_ohm=float(change.value)))
        else:
            updated = {"floating": False, "capacitance_F": None, "attached_to": Case.STRUCTURE}
        surfaces[change.surface] = surface.model_copy(update=updated)
    limits = tuple(_without_fields(limit, surfaces) for limit in case.limit)
    changed = case.model_copy(
        update={
            "surface": tuple(surfaces.values()),
            "link": tuple(links),
            "limit": tuple(limit for limit in limits if limit is not None),
        }
    )
    check_case(changed)
    return replace(
        loaded,
        case=changed,
        materials=MappingProxyType(materials),
        material_texts=MappingProxyType(texts),
    )


def _without_fields(limit: Any, surfaces: dict[str, Surface]) -> Any:
    """Limit on fields without the surfaces that have no film any more; None when empty."""
    if limit.kind != "field" or limit.surfaces is None:
        return limit
    rest = tuple(n for n in limit.surfaces if surfaces[n].thickness_m is not None)
    return limit.model_copy(update={"surfaces": rest}) if rest else None


def _limited(material: Material, largest: float) -> Material:
    """Material whose resistivity has `largest` as value and as upper end of its spread."""
    record = material.values["bulk_resistivity_ohm_m"]
    low = largest * min(1.0, record.spread.low / record.value)
    limited = replace(
        record,
        value=largest,
        spread=Spread("log_uniform", low, largest),
        basis="assumed",
        source=PROPOSED,
    )
    return replace(material, values={**material.values, "bulk_resistivity_ohm_m": limited})
