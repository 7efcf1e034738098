"""From a finished sweep to its files: dataset, ranking, table and pictures."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from charging.study.dataset import by_choice, sweep_dataset
from charging.study.documents import ranking_document
from charging.study.hands import Hands, Here
from charging.study.indices import Index, choice_indices
from charging.study.pictures import heat_map, tornado
from charging.study.plan import Plan
from charging.study.ranking import ChoiceRow, ranked
from charging.study.solve import Solver
from charging.study.store import Store, write_whole
from charging.study.verdict import RANKING, block_hashes
from charging.study.worst_case import WorstPlace, search_worst

TRIAL_BLOCK = 128
"""Members of a block of the indices and of the search: their rounds are small."""

FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")


@dataclass(frozen=True, slots=True)
class SweepReport:
    """What a study found.

    studied : the first choice that anything drives; indices and worst case are of it.
    """

    rows: tuple[ChoiceRow, ...]
    studied: ChoiceRow
    indices: tuple[Index, ...]
    worst: WorstPlace | None
    document: dict[str, Any]


def report_sweep(plan: Plan, store: Store, hands: Hands | None = None) -> SweepReport:
    """Rank a finished sweep and write sweep.nc, ranking.json, ranking.csv and pictures.

    `hands` solve what the indices and the search for the worst case need.

    Raises
    ------
    InputError
        A block is damaged.
    """
    solver = Solver(plan)
    hands = Here(solver) if hands is None else hands
    results = by_choice(plan, store)
    rows = ranked(plan, results, solver.names, solver.replicate)
    studied = next((row for row in rows if row.drivers), rows[0])
    indices = choice_indices(plan, hands, studied, TRIAL_BLOCK)
    worst = search_worst(plan, hands, studied.number, TRIAL_BLOCK)
    document = ranking_document(plan, rows, studied, indices, worst, block_hashes(store.finished()))
    folder = store.folder
    part = folder / "sweep.nc.part"
    dataset = sweep_dataset(plan, solver, results)
    dataset.to_netcdf(part, engine="netcdf4", format="NETCDF4")
    part.replace(folder / "sweep.nc")
    write_whole(folder / RANKING, _json(document))
    write_whole(folder / "ranking.csv", ranking_csv(rows).encode())
    heat_map(plan, rows, folder / "heat_map.png")
    if studied.drivers:
        tornado(studied, folder / "drivers.png")
    return SweepReport(rows, studied, indices, worst, document)


def ranking_csv(rows: Sequence[ChoiceRow]) -> str:
    """The ranking as comma-separated text; no cell begins like a formula."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(
        ["rank", "choice", "worst_V", "kind", "surface", "exceed_probability", "interval_low",
         "interval_high", "failed", "driver"]
    )  # fmt: skip
    for number, row in enumerate(rows, 1):
        writer.writerow(
            [number, _cell(row.choice), f"{row.worst_V:.6g}", row.kind, _cell(row.surface),
             f"{row.exceed.value:.6g}", f"{row.exceed.low:.6g}", f"{row.exceed.high:.6g}",
             row.failed, _cell(row.driver or "")]
        )  # fmt: skip
    return stream.getvalue()


def _cell(text: str) -> str:
    return f"'{text}" if text.startswith(FORMULA_STARTS) else text


def _json(document: dict[str, Any]) -> bytes:
    return json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False).encode()
