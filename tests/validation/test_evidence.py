"""The published figures that `halflit evidence` recomputes, and whether they would see a fault."""

from __future__ import annotations

import sys
from collections import Counter
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from types import MappingProxyType
from typing import Any

import numpy as np
import pytest

from charging.evidence.check import COUNTED, MOST_PER_FORMULA, Check, Row, evaluate
from charging.evidence.rows import TOPICS, all_checks, evidence

CHECKS = list(all_checks())


@pytest.fixture(scope="module")
def rows() -> list[Row]:
    return evidence()


@pytest.mark.parametrize("check", CHECKS, ids=[check.quantity for check in CHECKS])
def test_published(check: Check, rows: list[Row]) -> None:
    row = next(row for row in rows if row.quantity == check.quantity)
    text = f"{row.ours:g} against {row.published:g} {row.unit}: {row.source}"
    assert row.ok, text


def test_enough_rows_count_and_no_formula_fills_the_table() -> None:
    counted = [check for check in CHECKS if check.counted]
    assert len(counted) >= 60
    per_formula = Counter(check.formula for check in counted)
    assert max(per_formula.values()) <= MOST_PER_FORMULA, per_formula.most_common(3)
    assert len({check.quantity for check in CHECKS}) == len(CHECKS)


def test_what_counts_and_what_does_not(rows: list[Row]) -> None:
    for check in CHECKS:
        assert check.source
        if check.counted:
            assert check.basis in COUNTED
            assert "memory" not in check.source
    assert {c.basis for c in CHECKS if not c.counted} >= {"memory", "calibration"}
    flags = [row.counted for row in rows]
    assert flags == sorted(flags, reverse=True)


def test_the_page_holds_every_row_and_escapes_it(rows: list[Row]) -> None:
    from html.parser import HTMLParser

    from charging.evidence.page import evidence_page, sum_up

    hostile = Check("<script>x</script>", "x", 1.0, "V", 0.1, "a & b", "memory", lambda: 1.0)
    page = evidence_page([*rows, *evaluate([hostile])])
    assert "<script" not in page
    assert "a &amp; b" in page
    assert "http" not in page
    found: list[str] = []

    class Rows(HTMLParser):
        def handle_starttag(self, tag: str, attrs: object) -> None:
            found.append(tag)

    Rows().feed(page)
    assert found.count("tr") == len(rows) + 1 + 2  # a head for either table
    assert "counted rows agree" in sum_up(rows)


def test_json_has_the_keys_of_the_contract(rows: list[Row]) -> None:
    from dataclasses import asdict

    keys = {"quantity", "published", "ours", "unit", "tolerance", "source", "basis", "counted",
            "ok"}  # fmt: skip
    for row in rows:
        assert asdict(row).keys() >= keys


def test_a_figure_that_is_off_is_told() -> None:
    off = Check("x", "x", 2.0, "V", 0.01, "by hand", "closed form", lambda: 2.1)
    assert not evaluate([off])[0].ok
    lost = Check("x", "x", 2.0, "V", 0.01, "by hand", "closed form", lambda: float("nan"))
    assert not evaluate([lost])[0].ok
    factor = Check("x", "x", 2.0, "V", 3.0, "y", "measured", lambda: 0.7, "factor")
    assert evaluate([factor])[0].deviation == pytest.approx(2.0 / 0.7)


# --- a fault of five percent in any law is seen -------------------------------------------------

FAULT = 1.05


def faulty(function: Callable[..., Any]) -> Callable[..., Any]:
    def wrong(*args: Any, **kwargs: Any) -> Any:
        value = function(*args, **kwargs)
        if isinstance(value, tuple):
            parts = [FAULT * part for part in value]
            return type(value)(*parts) if hasattr(value, "_fields") else tuple(parts)
        return FAULT * value

    return wrong


def rooms() -> list[object]:
    return [
        module
        for name, module in list(sys.modules.items())
        if name.split(".")[0] in {"charging", "materials", "environments"}
    ]


@contextmanager
def planted(function: Callable[..., Any]) -> Iterator[None]:
    """Replace a function everywhere it is bound, in tables of functions too."""
    wrong = faulty(function)
    undo: list[tuple[object, str, object]] = []
    for module in rooms():
        for name, value in list(vars(module).items()):
            new: object = value
            if value is function:
                new = wrong
            elif isinstance(value, Mapping) and function in value.values():
                new = MappingProxyType({k: wrong if v is function else v for k, v in value.items()})
            elif isinstance(value, tuple) and hasattr(value, "_fields") and function in value:
                kind: Any = type(value)
                new = kind(*(wrong if part is function else part for part in value))
            if new is not value:
                undo.append((module, name, value))
                setattr(module, name, new)
    try:
        yield
    finally:
        for module, name, value in undo:
            setattr(module, name, value)


def functions() -> dict[str, Callable[..., Any]]:
    from charging.currents import cap_weights, collection, flow, focus
    from charging.shape import field
    from environments import (
        auroral_oval,
        magnetopause,
        plasma,
        plasmasphere,
        thermal_flux,
    )
    from materials import (
        angle,
        backscatter,
        conduction,
        ion_impact,
        maxwellian_yield,
        photo_laws,
        photoelectron_energies,
        photoyield,
        secondary_escape,
        yield_laws,
    )

    found: dict[str, Callable[..., Any]] = {}
    found |= {f"shape of {law}": shape for law, shape in yield_laws.NORMAL_SHAPES.items()}
    named: tuple[Callable[..., Any], ...] = (
        yield_laws.lin_joy_isotropic_shape,
        maxwellian_yield.maxwellian_yield,
        angle.exponential_angle_factor,
        angle.secondary_angle_coefficient,
        angle.backscatter_angle_coefficient,
        backscatter.prokopenko_laframboise_1980,
        backscatter.hunger_kuchler_1979,
        backscatter.maxwellian_backscatter,
        ion_impact.whipple_1981,
        secondary_escape.secondary_escape_fraction,
        conduction.arrhenius_kernel,
        conduction.enhancement_kernel,
        conduction.enhancement_factor_kernel,
        conduction.arrhenius_conductivity,
        photo_laws.fowler_function,
        photo_laws.law_yield,
        photoelectron_energies.direct_escape,
        photoyield.yield_per_photon,
        photoyield.photo_current_density,
        thermal_flux.one_sided_maxwellian_current,
        plasma.electron_debye_length_m,
        collection.sphere_factor,
        collection.cylinder_factor,
        collection.sheath_weight,
        flow.plane_limit,
        focus.focused_flux,
        cap_weights.sphere_weights,
        field.panel_integrals,
        auroral_oval.equatorward_edge_deg,
        auroral_oval.poleward_edge_deg,
        magnetopause.magnetopause_radius,
        magnetopause.magnetopause_standoff,
        plasmasphere.saturated_density_m3,
        plasmasphere.trough_density_m3,
    )
    found |= {f"{one.__module__}.{one.__name__}": one for one in named}
    return found


FUNCTIONS = functions()


TOPIC_OF = {
    "materials.conduction": "dielectrics",
    "charging.currents.flow": "low orbit",
    "charging.currents.focus": "low orbit",
    "environments.auroral_oval": "low orbit",
    "environments.magnetopause": "regions",
    "environments.plasmasphere": "regions",
    "charging.currents.cap_weights": "barriers and shapes",
    "charging.shape.integrals": "barriers and shapes",
    "environments.thermal_flux": "plasma",
    "environments.plasma": "plasma",
    "charging.currents.collection": "plasma",
}
"""Where to look first."""


def checks_for(function: Callable[..., Any]) -> Iterator[Check]:
    first = TOPIC_OF.get(function.__module__)
    if first is not None:
        yield from TOPICS[first]()
    yield from all_checks()


@pytest.mark.parametrize("name", FUNCTIONS)
def test_a_planted_fault_fails_a_counted_row(name: str) -> None:
    with planted(FUNCTIONS[name]):
        for check in checks_for(FUNCTIONS[name]):
            if not check.counted:
                continue
            try:
                row = evaluate([check])[0]
            except (ArithmeticError, ValueError):  # the fault broke an identity on the way
                return
            if not row.ok:
                return
    pytest.fail(f"a fault of 5 percent in {name} passes every counted row")


def test_a_planted_fault_in_a_distribution_fails_a_counted_row() -> None:
    from environments.auroral import FlatAndMaxwellian
    from environments.distributions import Kappa

    kinds: tuple[Any, ...] = (Kappa, FlatAndMaxwellian)
    for kind in kinds:
        right = kind.flux
        try:
            kind.flux = faulty(right)
            counted = (c for c in TOPICS["plasma"]() if c.counted)
            assert not all(evaluate([check])[0].ok for check in counted)
        finally:
            kind.flux = right


def test_the_fault_is_taken_out_again() -> None:
    with planted(FUNCTIONS["charging.currents.collection.sphere_factor"]):
        pass
    from charging.currents.collection import SPHERE

    assert float(SPHERE.factor(np.array(1.0))) == 2.0
