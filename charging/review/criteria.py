"""Published design limits against surface charging, as data with where they come from."""

from dataclasses import dataclass
from typing import TypeAlias

from charging.case_types import LimitKind

Kind: TypeAlias = LimitKind


@dataclass(frozen=True, slots=True)
class Criterion:
    """One published limit.

    Attributes
    ----------
    kind : Kind
    allowed : float
        Magnitude [V], [V m-1] or [J].
    document, issue, clause : str
        An empty clause is one that nobody has seen.
    verified : bool
        Whether the text of the clause was read. A verdict "within" needs that.
    note : str
        What the figure is for, and how it is known.
    """

    kind: Kind
    allowed: float
    document: str
    issue: str
    clause: str
    verified: bool
    note: str


_ECSS = ("ECSS-E-ST-20-06C", "31 July 2008")
# Rev.1 of 15 May 2019 replaces that issue; its text was not seen, so the issue stands here
_ECSS_NORMAL = "dielectric against an adjacent conductor at a more positive potential"
_ECSS_INVERTED = "dielectric against an adjacent exposed conductor at a more negative potential"
_NASA = ("NASA TP-2361 and NASA-HDBK-4002A", "1984 and 2011")
_NASA_NOTE = (
    "from memory; whether it means the dielectric above or below the conductor is not settled, "
    "so it is applied both ways"
)
_JAXA = ("JERG-2-211A", "10 May 2012")
_JAXA_NOTE = "from memory: threshold of solar-array tests; the text was not seen"

CRITERIA: dict[str, tuple[Criterion, ...]] = {
    "ECSS": (
        Criterion("normal", 1000.0, *_ECSS, "6.2.1 a.1", True, _ECSS_NORMAL),
        Criterion("field", 1e7, *_ECSS, "6.2.1 a.2", True, "inside the dielectric"),
        Criterion("inverted", 100.0, *_ECSS, "6.2.1 a.3", True, _ECSS_INVERTED),
        Criterion("neighbour normal", 1000.0, *_ECSS, "6.2.1 a.1", True, _ECSS_NORMAL),
        Criterion("neighbour inverted", 100.0, *_ECSS, "6.2.1 a.3", True, _ECSS_INVERTED),
    ),
    "NASA": (
        Criterion("normal", 500.0, *_NASA, "", False, _NASA_NOTE),
        Criterion("inverted", 500.0, *_NASA, "", False, _NASA_NOTE),
        Criterion("field", 1e7, *_NASA, "", False, "dielectric-conductor interface, from memory"),
        Criterion("neighbour", 400.0, *_NASA, "", False, "differential guideline, from memory"),
    ),
    "JAXA": (
        Criterion("inverted", 400.0, *_JAXA, "", False, _JAXA_NOTE),
        Criterion("neighbour inverted", 400.0, *_JAXA, "", False, _JAXA_NOTE),
    ),
}
"""Sets that ``[review] criteria`` picks from; the first is the default."""

WHEN_EXCEEDED = (
    "ECSS-E-ST-20-06C (31 July 2008), 6.2.1 b: an assembly that does not meet 6.2.1 a goes to "
    "charging tests (6.6)."
)

ENERGY_CLASSES_J = ((1e-3, "negligible"), (1e-2, "note"), (1.0, "act"), (float("inf"), "severe"))
"""Classes of stored energy by upper end: this project's own, assumed, not a standard."""


def energy_class(energy_J: float) -> str:
    """Name the class of a stored energy; information, never a statement about discharges.

    Examples
    --------
    >>> energy_class(2e-4), energy_class(0.04)
    ('negligible', 'act')
    """
    return next(name for most, name in ENERGY_CLASSES_J if energy_J < most)
