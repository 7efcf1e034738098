"""The spacecraft of a case as faces, materials and a network."""

from collections.abc import Mapping, Sequence

from charging.case_tables import Case, Surface
from charging.network.nodes import Face, Network, network
from materials.library import load_material
from materials.record import Material
from materials.surface_state import in_state

REFERENCE_TEMPERATURE_K = 298.15
"""Temperature to which resistivities of the library belong."""


def face(surface: Surface, material: Material) -> Face:
    """Combine a surface of a case file with its material."""
    if surface.thickness_m is not None:
        return Face(
            name=surface.name,
            attached_to=surface.attached_to,
            area_m2=surface.area_m2,
            thickness_m=surface.thickness_m,
            relative_permittivity=material.value("relative_permittivity"),
            resistivity_ohm_m=material.value("bulk_resistivity_ohm_m"),
            activation_energy_eV=material.value("activation_energy_eV"),
        )
    return Face(
        name=surface.name,
        attached_to=surface.attached_to,
        area_m2=surface.area_m2,
        isolated_capacitance_F=surface.capacitance_F or 0.0,
    )


def spacecraft_network(case: Case, materials: Mapping[str, Material]) -> Network:
    """Build the network of a case; `materials` by the name or path the file gives."""
    return network(
        [face(s, materials[s.material]) for s in case.surface],
        [(*link.between, link.resistance_ohm) for link in case.link],
        case.body.radius_m,
    )


def surface_materials(case: Case, materials: Mapping[str, Material]) -> Sequence[Material]:
    """Materials in the order of the surfaces, each in the state its surface asks for."""

    def kept(name: str) -> Material:
        return materials[name] if name in materials else load_material(name)

    states: dict[tuple[str, str], Material] = {}
    for s in case.surface:
        key = (s.material, s.surface_state)
        if key not in states:
            states[key] = in_state(materials[s.material], s.surface_state, load=kept)
    return tuple(states[s.material, s.surface_state] for s in case.surface)
