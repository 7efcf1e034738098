"""What a surface is made of: records with sources, and how they emit and conduct.

Knows nothing of plasma, orbit or spacecraft. Energies are in eV, currents
in A m-2 with positive charge arriving counted positive, all else in SI.
"""

from materials.errors import MaterialError
from materials.library import (
    PROPERTIES,
    Material,
    PhotoYield,
    Property,
    Spread,
    Value,
    library_text,
    load_material,
    material_names,
    read_material,
)

__all__ = [
    "PROPERTIES",
    "Material",
    "MaterialError",
    "PhotoYield",
    "Property",
    "Spread",
    "Value",
    "library_text",
    "load_material",
    "material_names",
    "read_material",
]
