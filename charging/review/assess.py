"""Verdicts of a review: what is exceeded, what is within, what cannot be assessed and why."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

from charging.array_strings import array_voltage_V
from charging.case import LoadedCase
from charging.review.extremes import STRUCTURE, Quantity, node_of
from charging.review.limits import Requirement, Standing, Verdict, size_of, standing
from charging.review.nominal import Cell, Place
from charging.review.sensitivity import Corner
from charging.review.space import Property, Variant, properties
from charging.wakes import unfed_surfaces

DRIVES = 0.05
"""Share of the limit by which a property must move a quantity to drive it from elsewhere."""

MOST_FAILED = 0.05
"""Share of draws without a solution above which nothing is said about the corner."""

LEAST_DRAWS = 500
ARRAY_VOLTAGE_V = 70.0
"""Array voltage above which a pass is never unqualified."""

NAMES_SHOWN = 4

UNSEARCHED = "spreads of properties were not run (halflit review --corners runs them)"


@dataclass(frozen=True, slots=True)
class Row:
    """One requirement against what it concerns.

    Attributes
    ----------
    requirement : Requirement
    quantity : Quantity
    nominal : Place
        Worst at the values of the records; indexes into the cells.
    corner : Corner
    standing : Standing
        Of the governing value: the worse of nominal and corner.
    cell, variant, time_s
        Where the governing value was found.
    verdict : Verdict
    reason : str
    """

    requirement: Requirement
    quantity: Quantity
    nominal: Place
    corner: Corner
    standing: Standing
    cell: int
    variant: Variant
    time_s: float
    verdict: Verdict
    reason: str

    @property
    def severity(self) -> float:
        """Size over limit; above 1 is exceeded."""
        return size_of(self.quantity.kind, self.standing.value) / self.requirement.limit

    @property
    def at_corner(self) -> bool:
        """Whether the corner governs, not the values of the records."""
        kind = self.quantity.kind
        return size_of(kind, self.corner.value) > size_of(kind, self.nominal.value)


class Doubts(NamedTuple):
    """What may keep a limit from being within.

    properties : without a source; plasmas : resting on assumed figures; wakes : surfaces whose
    ion current is not assessable.
    """

    properties: Sequence[Property] = ()
    plasmas: Sequence[str] = ()
    wakes: frozenset[str] = frozenset()


def assessed(
    loaded: LoadedCase,
    cells: Sequence[Cell],
    rows: Sequence[tuple[Requirement, Quantity, Place, Corner]],
) -> tuple[Row, ...]:
    """Judge every row; the worst first."""
    unknown = _without_source(loaded)
    doubts = Doubts(unknown, assumed_plasmas(loaded, cells), _unfed(loaded, cells))
    found = [_row(loaded, cells, doubts, *one) for one in rows]
    return tuple(sorted(found, key=lambda row: -row.severity))


def _row(
    loaded: LoadedCase,
    cells: Sequence[Cell],
    doubts: Doubts,
    requirement: Requirement,
    quantity: Quantity,
    nominal: Place,
    corner: Corner,
) -> Row:
    kind = quantity.kind
    at_corner = size_of(kind, corner.value) > size_of(kind, nominal.value)
    value = corner.value if at_corner else nominal.value
    stand = standing(requirement, value)
    at_nominal = standing(requirement, nominal.value).exceeded
    statistical = loaded.case.review.statistical
    passes = (
        statistical is not None
        and not at_nominal
        and corner.draws.count >= LEAST_DRAWS
        and corner.draws.failed == 0
        and not standing(requirement, corner.draws.largest).exceeded
    )
    reasons = reasons_against(loaded, requirement, quantity, corner, doubts)
    if at_nominal:
        verdict: Verdict = "exceeded"
        reason = f"beyond {requirement.requirement_id} at the values of the records"
    elif stand.exceeded and not passes:
        verdict = "exceeded"
        reason = (
            f"below {requirement.requirement_id} at the values of the records, beyond it at the "
            "corner of their spreads"
        )
    elif reasons:
        verdict, reason = "not assessable", "; ".join(reasons)
    else:
        verdict = "within"
        reason = "zero by construction: bonded" if corner.trivial else "nominal and corner below"
        if stand.exceeded:
            reason = (
                f"the corner is beyond, but none of {corner.draws.count} draws is, and the case "
                f"accepts that: {statistical}; conditional on assumed spreads"
            )
    place = (corner.scene, corner.variant, corner.time_s)
    if not at_corner:
        place = (nominal.cell, cells[nominal.cell].variants[nominal.variant], nominal.time_s)
    return Row(requirement, quantity, nominal, corner, stand, *place, verdict, reason)


def reasons_against(
    loaded: LoadedCase,
    requirement: Requirement,
    quantity: Quantity,
    corner: Corner,
    doubts: Doubts,
) -> list[str]:
    """Why a quantity that exceeds nothing still cannot be called within."""
    found = []
    if not requirement.verified:
        found.append(f"the clause behind {requirement.requirement_id} was not read")
    if doubts.plasmas and loaded.case.plasma.accept_assumed is None:
        found.append(
            f'plasma "{doubts.plasmas[0]}" rests on assumed figures; accept it with [plasma] '
            'accept_assumed = "reason"'
        )
    driving = [p for p in doubts.properties if _drives(loaded, requirement, quantity, corner, p)]
    if driving:
        names = [f"{p.key} of {p.material}" for p in driving]
        more = f" and {len(names) - NAMES_SHOWN} more" if len(names) > NAMES_SHOWN else ""
        found.append(f"no source for {', '.join(names[:NAMES_SHOWN])}{more}")
    if not corner.searched:
        found.append(UNSEARCHED)
    elif not corner.trivial:
        total = corner.draws.count + corner.draws.failed
        if total < LEAST_DRAWS:
            found.append(f"the corner was checked by {total} draws, fewer than {LEAST_DRAWS}")
        elif corner.draws.failed > MOST_FAILED * total:
            found.append(f"{corner.draws.failed} of {total} draws found no solution")
    dark = [n for n in (quantity.surface, quantity.against) if n in doubts.wakes]
    if dark:
        found.append(f"wake ion current not assessable on {', '.join(dark)}")
    if quantity.kind == "structure" and loaded.case.review.crew_outside:
        found.append(
            "nothing is said here for crew outside the vehicle: that needs its own safety process"
        )
    return found


def assumed_plasmas(loaded: LoadedCase, cells: Sequence[Cell]) -> list[str]:
    """Plasmas of any scene that rest on assumed figures, in part or whole."""
    return list(dict.fromkeys(name for cell in cells for name in cell.run.assumed))


def _unfed(loaded: LoadedCase, cells: Sequence[Cell]) -> frozenset[str]:
    """Surfaces whose ion current in the wake is not assessable in some scene."""
    return frozenset(loaded.case.names[i] for cell in cells for i in unfed_surfaces(cell.run))


def _without_source(loaded: LoadedCase) -> list[Property]:
    """Properties without a source, that of a photoyield and of every age included."""
    found = {
        p.name: p
        for age in loaded.case.review.ages
        for p in properties(loaded, age)
        if not p.source.strip()
    }
    return list(found.values())


def _drives(
    loaded: LoadedCase,
    requirement: Requirement,
    quantity: Quantity,
    corner: Corner,
    one: Property,
) -> bool:
    """Whether a property enters a quantity: through its own surfaces, or by what it moves.

    A surface bonded to what it is against has no difference, so nothing drives it.
    """
    if corner.trivial:
        return False
    case = loaded.case
    own = [name for name in (quantity.surface, quantity.against) if name in case.names]
    if quantity.kind == "structure":
        own = [name for name in case.names if node_of(case, name) == STRUCTURE]
    if any(name in one.surfaces for name in own):
        return True
    return any(
        s.of.name == one.name and s.reach > DRIVES * requirement.limit for s in corner.sensitivities
    )


def qualifications(loaded: LoadedCase) -> tuple[str, ...]:
    """What goes with every verdict of a case, however good."""
    found = []
    voltage = array_voltage_V(loaded.case)
    if voltage > ARRAY_VOLTAGE_V:
        found.append(
            f"specialist review: the solar array works at {voltage:g} V, above "
            f"{ARRAY_VOLTAGE_V:g} V, and arcs of arrays are not modelled"
        )
    if loaded.case.review.crew_outside:
        found.append(
            "crew outside the vehicle: nothing here applies to them; that needs its own safety "
            "process"
        )
    if loaded.case.review.statistical is not None:
        found.append(
            f"a statistical pass may override a corner ({loaded.case.review.statistical}); "
            "probabilities are conditional on assumed spreads"
        )
    return tuple(found)
