"""Mean atomic numbers of the library against the composition of the materials."""

from __future__ import annotations

import pytest

from materials import load_material

ATOMS = {
    "H": (1, 1.008), "B": (5, 10.81), "C": (6, 12.011), "N": (7, 14.007), "O": (8, 15.999),
    "F": (9, 18.998), "Na": (11, 22.990), "Mg": (12, 24.305), "Al": (13, 26.982),
    "Si": (14, 28.085), "Ca": (20, 40.078), "Ti": (22, 47.867), "Cr": (24, 51.996),
    "Fe": (26, 55.845), "Ni": (28, 58.693), "Zn": (30, 65.38),
}  # fmt: skip
POLYIMIDE = {"C": 22, "H": 10, "N": 2, "O": 5}
SILICA, ALUMINA = {"Si": 1, "O": 2}, {"Al": 2, "O": 3}


def mean_z(formula: dict[str, int]) -> float:
    """Mean atomic number by mass fraction; masses of the IUPAC table."""
    mass = {element: ATOMS[element][1] * count for element, count in formula.items()}
    return sum(mass[element] * ATOMS[element][0] for element in formula) / sum(mass.values())


@pytest.mark.parametrize(
    ("name", "mixture", "tolerance"),
    [
        ("polyimide film", [(1.0, POLYIMIDE)], 0.02),
        ("PTFE", [(1.0, {"C": 1, "F": 2})], 0.02),
        ("FEP film, silvered", [(1.0, {"C": 1, "F": 2})], 0.02),
        ("fused silica", [(1.0, SILICA)], 0.02),
        ("alumina", [(1.0, ALUMINA)], 0.02),
        ("anodised aluminium", [(1.0, ALUMINA)], 0.02),
        (
            "stainless steel",
            [(0.7, {"Fe": 1}), (0.19, {"Cr": 1}), (0.1, {"Ni": 1}), (0.01, {"Si": 1})],
            0.02,
        ),
        (
            "cover glass",
            [(0.8, SILICA), (0.13, {"B": 2, "O": 3}), (0.04, {"Na": 2, "O": 1}), (0.03, ALUMINA)],
            0.08,  # without the ceria
        ),
        (
            "white paint, zinc oxide-silicone",
            [(0.6, {"Zn": 1, "O": 1}), (0.4, {"C": 2, "H": 6, "Si": 1, "O": 1})],
            0.05,
        ),
        (
            "lunar regolith",
            [
                (0.45, SILICA),
                (0.16, {"Fe": 1, "O": 1}),
                (0.15, ALUMINA),
                (0.11, {"Ca": 1, "O": 1}),
                (0.09, {"Mg": 1, "O": 1}),
                (0.04, {"Ti": 1, "O": 2}),
            ],
            0.02,
        ),
    ],
)
def test_mean_atomic_number_follows_from_the_composition(
    name: str, mixture: list[tuple[float, dict[str, int]]], tolerance: float
) -> None:
    expected = sum(share * mean_z(formula) for share, formula in mixture)
    assert load_material(name).value("mean_atomic_number") == pytest.approx(expected, rel=tolerance)
