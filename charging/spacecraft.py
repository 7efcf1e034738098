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
            radiation_conductivity_S_m=material.get("radiation_conductivity_S_m", 0.0),
            radiation_exponent=material.get("radiation_conductivity_exponent", 1.0),
        )
    return Face(
        name=surface.name,
        attached_to=surface.attached_to,
        area_m2=surface.area_m2,
        isolated_capacitance_F=surface.capacitance_F or 0.0,
    )


def spacecraft_network(
    case: Case,
    materials: Mapping[str, Material],
    links: Sequence[tuple[str, str, float]] | None = None,
) -> Network:
    """Build the network of a case.

    Parameters
    ----------
    case : Case
    materials : mapping of str to Material
        By the name or path the file gives.
    links : sequence of (name, name, resistance), optional
        Resistors [ohm]; default: those of the case.
    """
    if links is None:
        links = [(*link.between, link.resistance_ohm) for link in case.link]
    free_space = None
    if case.shape:
        from charging.shape.solution import shape_field  # solved only for cases with shapes
        from charging.shape.views import craft_of

        free_space = shape_field(craft_of(case)).capacitance_F
    faces = [face(s, materials[s.material]) for s in case.surface]
    return network(faces, links, case.body.radius_m, free_space)


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
