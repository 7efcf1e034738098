"""What the library holds: materials and plasmas."""

from __future__ import annotations

from collections.abc import Sequence
from math import isfinite
from typing import TYPE_CHECKING, Annotated

import typer

from charging.cli.output import one_line, print_json, print_table
from charging.cli.runs import Json

if TYPE_CHECKING:
    from environments.plasma import Plasma
    from materials.record import Material

OneMaterial = Annotated[
    str | None,
    typer.Argument(
        metavar="[M]", show_default=False, help="Name, or a file (ends in .toml or holds '/')."
    ),
]
OnePlasma = Annotated[
    str | None,
    typer.Argument(
        metavar="[P]", show_default=False, help="Name, or a file (ends in .toml or holds '/')."
    ),
]


def register(app: typer.Typer) -> None:
    """Add the commands to the application."""
    app.command(epilog='Example: halflit materials "polyimide film"')(materials)
    app.command(epilog='Example: halflit plasmas "ECSS geostationary worst case"')(plasmas)


def materials(material: OneMaterial = None, json: Json = False) -> None:
    """List the materials of the library, or everything about one with its sources."""
    from charging.arguments import as_material
    from materials.library import load_material, material_names

    found = (
        [load_material(name) for name in material_names()]
        if material is None
        else [as_material(material)]
    )
    if json:
        print_json([material_document(one) for one in found])
    elif material is None:
        _print_materials(found)
    else:
        _print_material(found[0])


def plasmas(plasma: OnePlasma = None, json: Json = False) -> None:
    """List the plasmas of the catalogue, or the populations and moments of one."""
    from charging.arguments import as_plasma
    from environments.catalogue import load_plasma, plasma_names

    found = (
        [load_plasma(name) for name in plasma_names()] if plasma is None else [as_plasma(plasma)]
    )
    if json:
        print_json([plasma_document(one) for one in found])
    elif plasma is None:
        _print_plasmas(found)
    else:
        _print_plasma(found[0])


def material_document(material: Material) -> dict[str, object]:
    """Return a material as JSON: every value with unit, spread, basis and source."""
    from materials.record import PROPERTIES

    curve = material.photoyield
    return {
        "name": material.name,
        "kind": material.kind,
        "basis": material.weakest_basis,
        "description": material.description,
        "emits": material.emits,
        "values": {
            key: {
                "value": value.value,
                "unit": PROPERTIES[key].unit,
                "spread": {
                    "law": value.spread.law,
                    "low": value.spread.low,
                    "high": value.spread.high,
                },
                "basis": value.basis,
                "source": value.source,
                "holds": value.holds,
                "measurement_method": value.measurement_method,
                "note": value.note,
            }
            for key, value in material.values.items()
        },
        "photoyield": None
        if curve is None
        else {
            "photon_energy_eV": curve.photon_energy_eV.tolist(),
            "electrons_per_photon": curve.electrons_per_photon.tolist(),
            "basis": curve.basis,
            "level": curve.level,
            "spread_factor": curve.spread_factor,
            "source": curve.source,
            "note": curve.note,
        },
    }


def plasma_document(plasma: Plasma) -> dict[str, object]:
    """Return a plasma as JSON: source, populations with moments, null where undefined."""
    from environments.plasma import (
        extrapolated_share,
        moments,
        population_names,
        warnings_of,
    )

    columns = {name: values.tolist() for name, values in moments(plasma).items()}
    return {
        "name": plasma.name,
        "title": plasma.title,
        "source": plasma.source,
        "basis": plasma.basis,
        "clause": plasma.clause,
        "note": plasma.note,
        "electron_debye_length_m": _debye_m(plasma),
        "electron_to_ion_current_ratio": _ratio(plasma),
        "warnings": list(warnings_of(plasma)),
        "populations": [
            {
                "name": name,
                "species": population.species.name,
                "charge_number": population.species.charge_number,
                "law": population.law,
                "extrapolated_share": extrapolated_share(population),
                **{k: v[i] if isfinite(v[i]) else None for k, v in columns.items()},
            }
            for i, (name, population) in enumerate(
                zip(population_names(plasma.populations), plasma.populations, strict=True)
            )
        ],
    }


def _or_infinite(value: float) -> str:
    return f"{value:.3g}" if isfinite(value) else "infinite"


def _debye_m(plasma: Plasma) -> float | None:
    from environments.errors import EnvironmentDataError
    from environments.plasma import electron_debye_length_m

    try:
        return electron_debye_length_m(plasma)
    except EnvironmentDataError:
        return None


def _ratio(plasma: Plasma) -> float | None:
    from environments.errors import EnvironmentDataError
    from environments.plasma import electron_to_ion_current_ratio

    try:
        return electron_to_ion_current_ratio(plasma)
    except EnvironmentDataError:
        return None


def _print_materials(found: Sequence[Material]) -> None:
    def cell(material: Material, key: str, form: str = "g") -> str:
        return f"{material.values[key].value:{form}}" if key in material.values else "-"

    print_table(
        [
            (
                one.name,
                one.kind,
                "-" if one.photoyield is None else f"{one.photoyield.threshold_eV:g}",
                cell(one, "secondary_yield_peak"),
                cell(one, "secondary_yield_peak_energy_eV"),
                cell(one, "relative_permittivity"),
                cell(one, "bulk_resistivity_ohm_m", ".1e"),
                one.weakest_basis if one.emits else "-",
            )
            for one in found
        ],
        (
            "name",
            "kind",
            "photo-\nthreshold eV",
            "peak\nyield",
            "peak\nenergy eV",
            "relative\npermittivity",
            "resistivity\nohm m",
            "weakest\nbasis",
        ),
        "llrrrrrl",
    )
    print("Resistivity: dark, low field, near 298 K. Sources and spreads: halflit materials NAME")


def _print_material(material: Material) -> None:
    from materials.record import PROPERTIES

    print(f"{material.name} ({material.kind}): {material.description}\n")
    if not material.emits:
        print("Takes up every particle and gives nothing back.")
        return
    entries = list(material.values.items())
    print_table(
        [
            (
                key,
                f"{value.value:g}",
                PROPERTIES[key].unit,
                f"{value.spread.low:g}",
                f"{value.spread.high:g}",
                value.basis,
                "; ".join(filter(None, (value.holds, value.measurement_method))),
                f"[{number}]",
            )
            for number, (key, value) in enumerate(entries, start=1)
        ],
        ("property", "value", "unit", "low", "high", "basis", "holds / method", "source"),
        "lrlrrlll",
    )
    for number, (_, value) in enumerate(entries, start=1):
        print(f"[{number}] {value.source}{f' ({value.note})' if value.note else ''}")
    curve = material.photoyield
    if curve is not None:
        print(
            f"\nphotoyield: {len(curve.photon_energy_eV)} points, {curve.threshold_eV:g} to "
            f"{curve.photon_energy_eV[-1]:g} eV, within a factor {curve.spread_factor:g}; "
            f"basis {curve.basis}; level {curve.level}\n{curve.source}"
            f"{f' ({curve.note})' if curve.note else ''}"
        )
    print("\nlow, high: range of about 90 percent probability. memory, assumed: not checked.")


def _print_plasmas(found: Sequence[Plasma]) -> None:
    def total(plasma: Plasma, *, electrons: bool) -> tuple[float, float]:
        """Density [cm-3] and mean temperature [eV], weighted by density."""
        rows = [p for p in plasma.populations if (p.species.charge_number < 0) == electrons]
        density = sum(p.density_m3 for p in rows)
        hot = sum(p.density_m3 * p.temperature_eV for p in rows)
        return density * 1e-6, hot / density if density else 0.0

    rows = []
    for one in found:
        electron, ion = total(one, electrons=True), total(one, electrons=False)
        debye, ratio = _debye_m(one), _ratio(one)
        rows.append(
            (
                one.name,
                f"{electron[0]:.3g}",
                f"{electron[1]:.4g}",
                f"{ion[0]:.3g}",
                f"{ion[1]:.4g}",
                "-" if debye is None else f"{debye:.3g}",
                "-" if ratio is None else f"{ratio:.3g}",
                one.basis,
            )
        )
    print_table(
        rows,
        (
            "name",
            "electrons\ncm-3",
            "mean T\neV",
            "ions\ncm-3",
            "mean T\neV",
            "Debye\nlength m",
            "electron/ion\ncurrent",
            "basis",
        ),
        "lrrrrrrl",
    )
    print("Used as printed, never neutralised. Populations and sources: halflit plasmas NAME")


def _print_plasma(plasma: Plasma) -> None:
    from environments.plasma import (
        extrapolated_share,
        moments,
        population_names,
        warnings_of,
    )

    print(f"{plasma.name}: {one_line(plasma.title)}\n")
    values = moments(plasma)
    print_table(
        [
            (
                name,
                population.law,
                f"{population.density_m3 * 1e-6:.4g}",
                f"{population.temperature_eV:.4g}",
                f"{1e6 * values['current_density_A_m2'][i]:+.4g}",
                f"{values['mean_energy_eV'][i]:.4g}",
                _or_infinite(float(values["energy_flux_eV_m2_s"][i])),
            )
            for i, (name, population) in enumerate(
                zip(population_names(plasma.populations), plasma.populations, strict=True)
            )
        ],
        (
            "population",
            "law",
            "density\ncm-3",
            "temperature\neV",
            "one-sided current\nuA m-2",
            "mean energy\neV",
            "energy flux\neV m-2 s-1",
        ),
        "llrrrrr",
    )
    debye, ratio = _debye_m(plasma), _ratio(plasma)
    print(
        f"\nelectron Debye length {'-' if debye is None else f'{debye:.4g} m'}, "
        f"electron/ion current {'-' if ratio is None else f'{ratio:.4g}'}"
    )
    print(
        f"source ({plasma.basis}): {plasma.source}{f', {plasma.clause}' if plasma.clause else ''}"
    )
    names = population_names(plasma.populations)
    for name, population in zip(names, plasma.populations, strict=True):
        if population.law == "tabulated":
            share = 100.0 * extrapolated_share(population)
            print(f"{name}: {share:.2g} % of the current extrapolated below the first channel")
    for warning in warnings_of(plasma):
        print(f"warning: {warning}")
    if plasma.note:
        print(f"note: {plasma.note}")
