"""Check of one material record, entry by entry."""

from __future__ import annotations

from collections.abc import Iterable

from materials.entries import (
    Table,
    choice_at,
    number_at,
    refuse_unknown,
    source_at,
    table_at,
    text_at,
)
from materials.errors import MaterialError
from materials.photoyield_reader import photoyield_from, states_from
from materials.record import (
    BASES,
    EMISSION_LAWS,
    EMISSION_NEEDED,
    EMISSION_OPTIONAL,
    KINDS,
    NAME_PATTERN,
    PROPERTIES,
    RESISTIVITY_METHODS,
    SPREAD_LAWS,
    YIELD_HOLDS,
    Material,
    Spread,
    Value,
)

_HEAD = ("name", "kind", "description", "emits")
_VALUE_KEYS = ("value", "source", "basis", "spread", "note")
_EXTRA_KEYS = {
    "secondary_yield_peak": ("holds", YIELD_HOLDS),
    "bulk_resistivity_ohm_m": ("measurement_method", RESISTIVITY_METHODS),
}


def material_from(document: Table) -> Material:
    """Return the material of a parsed record; see `materials.read_material`."""
    known = (*_HEAD, *EMISSION_LAWS, "photoyield", "surface_state", *PROPERTIES)
    refuse_unknown(document, known, ())
    name = text_at(document, ("name",))
    if NAME_PATTERN.fullmatch(name) is None:
        raise MaterialError(
            ("name",),
            name,
            "is no usable name",
            allowed="1 to 64 letters, digits, spaces and ,()._+-, no space at either end",
        )
    kind = choice_at(document, ("kind",), KINDS)
    emits = document.get("emits", True)
    if not isinstance(emits, bool):
        raise MaterialError(("emits",), emits, "is no truth value", allowed="true or false")
    description = text_at(document, ("description",)) if "description" in document else ""
    values = {key: _value(document[key], key) for key in PROPERTIES if key in document}
    curve = photoyield_from(document["photoyield"]) if "photoyield" in document else None
    states = states_from(document["surface_state"]) if "surface_state" in document else {}
    laws = {
        key: choice_at(document, (key,), choices)
        for key, choices in EMISSION_LAWS.items()
        if key in document
    }
    material = Material(name, kind, description, emits, values, curve, states, laws)
    _check_completeness(material)
    _check_shifts(material)
    return material


def _check_shifts(material: Material) -> None:
    """Refuse a barrier shift larger than half the threshold it moves."""
    if material.photoyield is None:
        return
    half = 0.5 * material.photoyield.threshold_eV
    for name, state in material.surface_states.items():
        shift = state.barrier_shift_eV
        if shift is not None and abs(shift) > half:
            raise MaterialError(
                ("surface_state", name, "barrier_shift_eV"),
                shift,
                "is more than half the threshold",
                allowed=f"{-half:g} to {half:g} eV",
            )


def _check_completeness(material: Material) -> None:
    needed: list[str] = []
    if material.emits:
        needed += EMISSION_NEEDED
        if material.kind == "conductor":
            needed.append("work_function_eV")
        else:
            needed += ["photoelectric_threshold_eV", "secondary_energy_eV"]
        if material.photoyield is None:
            raise MaterialError(("photoyield",), None, "is missing in a material that emits")
    else:
        for key in (*EMISSION_NEEDED, *EMISSION_OPTIONAL):
            if key in material.values:
                raise MaterialError(
                    (key,), material.value(key), "has no meaning in a material with emits = false"
                )
        for where, there in (
            (next(iter(material.laws), "secondary_law"), bool(material.laws)),
            ("photoyield", material.photoyield is not None),
            ("surface_state", bool(material.surface_states)),
        ):
            if there:
                raise MaterialError(
                    (where,), None, "has no meaning in a material with emits = false"
                )
    if material.kind == "conductor":
        _refuse_other_kind(material, ("photoelectric_threshold_eV", "secondary_energy_eV"))
    else:
        _refuse_other_kind(material, ("work_function_eV",))
        needed += ["relative_permittivity", "bulk_resistivity_ohm_m"]
    for key in needed:
        if key not in material.values:
            raise MaterialError((key,), None, f"is missing in a {material.kind}")
    drop = material.get("backscatter_low_energy_drop", 0.0)
    if drop != 0.0 and "backscatter_drop_energy_eV" not in material.values:
        raise MaterialError(
            ("backscatter_drop_energy_eV",), None, "is missing beside backscatter_low_energy_drop"
        )
    coated = [k for k in ("coating_thickness_m", "substrate_atomic_number") if k in material.values]
    if coated:
        needed = ["coating_thickness_m", "substrate_atomic_number", "density_kg_m3"]
        for key in needed:
            if key not in material.values:
                raise MaterialError((key,), None, f"is missing beside {coated[0]}")
    if material.get("backscatter_high_energy", 0.0) < drop:
        raise MaterialError(
            ("backscatter_low_energy_drop", "value"),
            drop,
            "makes the backscatter coefficient negative",
            allowed="at most backscatter_high_energy",
        )


def _refuse_other_kind(material: Material, keys: Iterable[str]) -> None:
    for key in keys:
        if key in material.values:
            raise MaterialError(
                (key,), material.value(key), f"does not belong to a {material.kind}"
            )


def _value(entry: object, key: str) -> Value:
    table = table_at(entry, (key,))
    extra, choices = _EXTRA_KEYS.get(key, (None, ()))
    refuse_unknown(table, _VALUE_KEYS if extra is None else (*_VALUE_KEYS, extra), (key,))
    number = number_at(table, (key, "value"))
    unit, low, high, _ = PROPERTIES[key]
    allowed = f"{low:g} to {high:g}" + ("" if unit == "1" else f" {unit}")
    if not low <= number <= high:
        raise MaterialError((key, "value"), number, "is out of range", allowed=allowed)
    spread = _spread(table, key, number)
    if spread.low < low or spread.high > high:
        raise MaterialError(
            (key, "spread"), [spread.low, spread.high], "is out of range", allowed=allowed
        )
    word = None if extra is None else choice_at(table, (key, extra), choices)
    return Value(
        value=number,
        source=source_at(table, (key, "source")),
        basis=choice_at(table, (key, "basis"), BASES),
        spread=spread,
        measurement_method=word if extra == "measurement_method" else None,
        holds=word if extra == "holds" else None,
        note=text_at(table, (key, "note")) if "note" in table else "",
    )


def _spread(table: Table, key: str, number: float) -> Spread:
    if "spread" not in table:
        raise MaterialError(
            (key, "spread"), None, "is missing", allowed='{law = "uniform", low = …, high = …}'
        )
    entry = table_at(table["spread"], (key, "spread"))
    refuse_unknown(entry, ("law", "low", "high"), (key, "spread"))
    law = choice_at(entry, (key, "spread", "law"), SPREAD_LAWS)
    low, high = (number_at(entry, (key, "spread", end)) for end in ("low", "high"))
    if not low <= number <= high:
        raise MaterialError(
            (key, "spread"),
            [low, high],
            f"does not hold the value {number:g}",
            allowed="low to high",
        )
    if law == "log_uniform" and low <= 0.0:
        raise MaterialError(
            (key, "spread", "low"), low, "has no logarithm", allowed="above 0 for log_uniform"
        )
    return Spread(law, low, high)
