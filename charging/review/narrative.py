"""What a review says in words: values, places, times, drivers, fixes."""

from __future__ import annotations

from charging.clock import iso_time
from charging.review.assess import UNSEARCHED, Row
from charging.review.check import Review
from charging.review.criteria import WHEN_EXCEEDED, energy_class
from charging.review.extremes import Quantity
from charging.review.limits import UNITS
from charging.review.nominal import Cell
from charging.review.scenes import AGES, OWN_PLASMA
from charging.review.sentences import driver, first_fix, when


def plasma_name(review: Review, row: Row) -> str:
    """Plasma with the largest share at the worst moment of a row."""
    return review.cells[row.cell].run.plasma_at(row.time_s)


def moment(review: Review, time_s: float) -> str:
    """Time after the start as UTC."""
    return iso_time(review.loaded.case.epoch, time_s)


def shown(value: float, unit: str) -> str:
    """Write a value with its unit.

    Examples
    --------
    >>> shown(-1234.5, "V"), shown(4.65e7, "V m-1"), shown(0.0371, "J"), shown(3.0, "V")
    ('-1234 V', '4.65e+07 V/m', '37.1 mJ', '3 V')
    >>> shown(2.17, "J")
    '2.17 J'
    """
    if unit == "V":
        return f"{value:.0f} V" if abs(value) >= 100.0 else f"{value:.3g} V"
    if unit == "J":
        return f"{value:.3g} J" if abs(value) >= 1.0 else f"{1e3 * value:.3g} mJ"
    return f"{value:.3g} V/m"


def plain_time(text: str) -> str:
    """Write a time of a document for people.

    Examples
    --------
    >>> plain_time("2031-03-20T12:00:00Z")
    '2031-03-20 12:00:00 UTC'
    """
    return text.replace("T", " ").replace("Z", " UTC")


def law_name(law: str) -> str:
    """Name of a law for people.

    Examples
    --------
    >>> law_name("sanders_inouye_1979")
    'Sanders Inouye 1979'
    """
    return law.replace("_", " ").title()


def words(key: str) -> str:
    """Name of a property for people.

    Examples
    --------
    >>> words("secondary_yield_peak_energy_eV"), words("bulk_resistivity_ohm_m")
    ('secondary yield peak energy', 'bulk resistivity')
    """
    for unit in ("_eV", "_ohm_m", "_kg_m3", "_V_m", "_m"):
        key = key.removesuffix(unit)
    return key.replace("_", " ")


def sentence(review: Review, row: Row) -> str:
    """What, where, when, how long after which event, driven by what, first fix to try."""
    loaded, nominal = review.loaded, review.cells[row.nominal.cell]
    unit = UNITS[row.quantity.kind]
    limit = f"allowed {shown(row.requirement.limit, unit)} ({row.requirement.requirement_id})"
    what = _what(row.quantity, row.nominal.value, unit)
    name = row.quantity.surface or "structure"
    if row.corner.trivial:
        return f"{name} is bonded to what it is judged against, so it holds no difference; {limit}."
    if not row.nominal.value:
        never = f"never {_never(row.quantity)} {row.quantity.against}"
        text = f"{name} {never} at the values of the records; {limit}"
    else:
        text = (
            f"{name} {what} at {when(loaded, nominal.run, row.nominal.time_s)} "
            f"({_where(nominal, nominal.variants[row.nominal.variant].age)}); {limit}"
        )
    if row.at_corner:
        cell = review.cells[row.cell]
        text += (
            f"; at the corner of the spreads it {_what(row.quantity, row.corner.value, unit)} "
            f"({_where(cell, row.variant.age)})"
        )
    text += ". "
    if row.nominal.value:
        surface = row.quantity.surface
        text += driver(loaded, nominal.run, row.nominal.variant, surface, row.nominal.time_s) + ". "
    drivers = [s for s in row.corner.sensitivities[:2] if s.reach > 0.0]
    if drivers:
        names = " and ".join(f"{words(s.of.key)} of {s.of.material}" for s in drivers)
        text += f"Driven most by {names}. "
    if row.verdict == "exceeded":
        text += _first(review, row)
    elif row.verdict == "not assessable":
        text += f"Not assessable: {row.reason}."
    return text.strip()


def _where(cell: Cell, age: str) -> str:
    return f"mode {cell.scene.mode}, plasma {_plasma(cell)}, {AGES[age]}"


def _plasma(cell: Cell) -> str:
    if cell.run.around.along is not None:
        return cell.run.around.along.name
    if cell.scene.plasma != OWN_PLASMA:
        return cell.scene.plasma
    return " and ".join(dict.fromkeys(p.name for p in cell.run.whole_plasmas))


def _what(quantity: Quantity, value: float, unit: str) -> str:
    size = shown(abs(value), unit)
    side = "below" if value < 0.0 else "above"
    if quantity.kind == "field":
        return f"holds {size} across its film"
    if quantity.kind == "energy":
        return f"stores {size} ({energy_class(value)}, a class of this project)"
    if quantity.kind == "structure":
        return f"stands {size} {side} the plasma"
    return f"stands {size} {side} {quantity.against}"


def _never(quantity: Quantity) -> str:
    return "falls below" if "normal" in quantity.kind else "rises above"


def _first(review: Review, row: Row) -> str:
    name = row.quantity.surface
    tried = None if review.fixes is None else review.fixes.first_for(name)
    if tried is not None:
        return f"First fix, run alone in every mode and plasma: {tried}."
    surfaces = {s.name: s for s in review.loaded.case.surface}
    if name not in surfaces:
        return "First fix to try: larger bonded conductors that see the Sun."
    if review.fixes is not None and review.fixes.verified:
        own = [change.text for change in review.fixes.chosen if change.surface == name]
        if own:
            return f"First fix, in the combination that was reviewed whole: {'; '.join(own)}."
    note = "" if review.fixes is None else " (no fix of this surface alone was found)"
    return f"First fix to try: {first_fix(surfaces[name])}{note}."


def sentences(review: Review) -> list[str]:
    """One sentence per limit that is not within, the worst first; one for all that are."""
    order = ("exceeded", "not assessable")
    # one sentence for all whose only fault is that their spreads were not run
    found = [
        sentence(review, row)
        for verdict in order
        for row in review.rows
        if row.verdict == verdict and row.reason != UNSEARCHED
    ]
    left = sum(row.reason == UNSEARCHED for row in review.rows)
    if left:
        found.append(f"{left} limits are not exceeded at the values of the records: {UNSEARCHED}.")
    within = sum(row.verdict == "within" for row in review.rows)
    if within:
        found.append(f"{within} of {len(review.rows)} limits are within.")
    if any(row.verdict == "exceeded" for row in review.rows) and any(
        r.document == "ECSS-E-ST-20-06C" for r in review.limits
    ):
        found.append(WHEN_EXCEEDED)
    return list(dict.fromkeys(found))
