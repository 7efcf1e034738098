"""All checks in one list."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator

from charging.evidence.barriers import barrier_checks
from charging.evidence.check import Check, Row, evaluate
from charging.evidence.critical import critical_checks
from charging.evidence.dielectrics import dielectric_checks
from charging.evidence.low_orbit import low_orbit_checks
from charging.evidence.orbits import orbit_checks
from charging.evidence.plasmas import plasma_checks
from charging.evidence.regions import region_checks
from charging.evidence.sunlight import sunlight_checks
from charging.evidence.yields import yield_checks

TOPICS: dict[str, Callable[[], Iterable[Check]]] = {
    "sunlight": sunlight_checks,
    "yields": yield_checks,
    "critical temperatures": critical_checks,
    "plasma": plasma_checks,
    "dielectrics": dielectric_checks,
    "orbit": orbit_checks,
    "regions": region_checks,
    "low orbit": low_orbit_checks,
    "barriers and shapes": barrier_checks,
}
"""Topics in the order of the table."""


def all_checks() -> Iterator[Check]:
    """Every check, topic by topic."""
    for checks in TOPICS.values():
        yield from checks()


def evidence() -> list[Row]:
    """Recompute every check.

    Returns
    -------
    list of Row
        Rows that count first, then those from memory, calibrations and comparisons that share
        an input with the model; each group in the order of the topics.
    """
    rows = evaluate(all_checks())
    return [row for row in rows if row.counted] + [row for row in rows if not row.counted]
