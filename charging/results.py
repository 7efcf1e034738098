"""Results as documents and files: summary.json, surfaces.csv, result.nc, plots."""

from __future__ import annotations

import csv
import io
import json
import os
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

import xarray as xr

from charging import __version__
from charging.case import LoadedCase
from charging.cautions import cautions
from charging.clock import iso_time
from charging.dataset import mode_dataset
from charging.jump_rows import jump_rows
from charging.orbit_run import CaseRun, ModeRun
from charging.orbit_view import eclipse_rows
from charging.result_folder import result_folder
from charging.review.limits import UNITS
from charging.review.sentences import first_fixes, not_assessable, sentence, unmet
from charging.summary import Judgement, ModeSummary, Peak, case_summaries, worst

CSV_COLUMNS = (
    "mode",
    "surface",
    "material",
    "lowest_V",
    "highest_V",
    "worst_normal_V",
    "worst_normal_time",
    "worst_inverted_V",
    "worst_inverted_time",
    "largest_field_V_m",
    "verdict",
)


def result_name(number: int, law: str | None = None) -> str:
    """File of a mode: the base is result.nc, alternatives are numbered from 1.

    `law` is given for every emission law but the nominal one.

    Examples
    --------
    >>> result_name(0), result_name(2), result_name(1, "lin_joy_2005")
    ('result.nc', 'result_02.nc', 'result_01_lin_joy_2005.nc')
    """
    stem = "result" if number == 0 else f"result_{number:02d}"
    return f"{stem}.nc" if law is None else f"{stem}_{law}.nc"


def limit_row(loaded: LoadedCase, mode: ModeRun, judgement: Judgement) -> dict[str, Any]:
    """One judgement as the JSON of ``halflit review``."""
    stand = judgement.standing
    requirement = stand.requirement
    return {
        "surface": judgement.surface,
        "against": "structure" if requirement.kind != "field" else "conductor behind",
        "kind": requirement.kind,
        "requirement_id": requirement.requirement_id,
        "mode": judgement.mode,
        "plasma": mode.plasma_at(judgement.peak.time_s) if stand.value else None,
        "age": "begin",
        "value": stand.value if judgement.peak.assessable else None,
        "allowed": requirement.limit,
        "unit": UNITS[requirement.kind],
        "margin": stand.margin if judgement.peak.assessable else None,
        "margin_dB": stand.margin_dB if judgement.peak.assessable else None,
        "time": _moment_of(loaded, judgement.peak),
        "clause": requirement.clause or None,
        "law": judgement.peak.law,
        "verdict": judgement.verdict,
        "reason": judgement.reason,
    }


def _told(peak: Peak) -> float | None:
    """Value of a peak, or None where no voltage is to be given."""
    return peak.value if peak.assessable else None


def mode_document(loaded: LoadedCase, mode: ModeRun, summary: ModeSummary) -> dict[str, Any]:
    """Extremes, limits and verdict of one mode."""
    rows = []
    for peaks in summary.surfaces:
        judged = [j for j in summary.judgements if j.surface == peaks.surface]
        rows.append(
            {
                "surface": peaks.surface,
                "material": peaks.material,
                "lowest_V": _told(peaks.lowest),
                "highest_V": _told(peaks.highest),
                "worst_normal_V": _told(peaks.normal),
                "worst_normal_time": _moment_of(loaded, peaks.normal),
                "worst_inverted_V": _told(peaks.inverted),
                "worst_inverted_time": _moment_of(loaded, peaks.inverted),
                "largest_field_V_m": _told(peaks.field),
                "verdict": worst([j.verdict for j in judged]),
                "bonded": peaks.bonded,
                "limits": [limit_row(loaded, mode, j) for j in judged],
            }
        )
    return {
        "surfaces": rows,
        "structure": {
            "lowest_V": summary.structure_lowest.value,
            "lowest_time": _moment(loaded, summary.structure_lowest),
            "highest_V": summary.structure_highest.value,
            "highest_time": _moment(loaded, summary.structure_highest),
        },
        "eclipses": eclipse_rows(loaded.case.epoch, mode.around.eclipses),
        "steady_after_s": summary.steady_s,
        "jumps": [
            row for member in range(len(mode.laws)) for row in jump_rows(loaded, mode, member)
        ],
        "verdict": summary.verdict,
        "sentences": sentences(loaded, mode, summary),
        "first_fixes": first_fixes(loaded, summary.judgements),
    }


def sentences(loaded: LoadedCase, mode: ModeRun, summary: ModeSummary) -> list[str]:
    """One sentence per limit exceeded, the worst first; then what could not be assessed."""
    exceeded = [sentence(loaded, mode, j) for j in unmet(summary.judgements)]
    return exceeded + not_assessable(summary.judgements)


def summary_document(
    run: CaseRun, summaries: Sequence[ModeSummary], audits: Sequence[float]
) -> dict[str, Any]:
    """``summary.json``: the base mode on the top level, alternatives under ``modes``."""
    documents = [
        mode_document(run.loaded, mode, summary)
        for mode, summary in zip(run.modes, summaries, strict=True)
    ]
    warnings = list(dict.fromkeys(w for mode in run.modes for w in cautions(run.loaded, mode)))
    return {
        "title": run.loaded.case.title,
        "halflit_version": __version__,
        "case_sha256": run.loaded.sha256,
        "verdict": worst([s.verdict for s in summaries]),
        "laws": list(run.modes[0].laws),
        **{k: v for k, v in documents[0].items() if k != "verdict"},
        "charge_audit_relative": max(audits),
        "warnings": warnings,
        "modes": [
            {
                "mode": mode.name,
                "result": result_name(i),
                "results_by_law": {
                    law: result_name(i, law if member else None)
                    for member, law in enumerate(mode.laws)
                },
                "charge_audit_relative": audit,
                **document,
            }
            for i, (mode, document, audit) in enumerate(
                zip(run.modes, documents, audits, strict=True)
            )
        ],
        "note": "An estimate: program requirements, applicable standards and qualified "
        "specialists decide.",
    }


def plain_cell(value: Any) -> Any:
    """Keep a spreadsheet from reading a text as a formula; numbers stay numbers.

    Examples
    --------
    >>> plain_cell("=1+1"), plain_cell("-x"), plain_cell("panel"), plain_cell(-3.5)
    ("'=1+1", "'-x", 'panel', -3.5)
    """
    return f"'{value}" if isinstance(value, str) and value[:1] in "=+-@\t\r" and value else value


def surfaces_csv(document: dict[str, Any]) -> str:
    """``surfaces.csv``: one line per mode and surface."""
    text = io.StringIO()
    table = csv.DictWriter(text, CSV_COLUMNS, extrasaction="ignore", lineterminator="\n")
    table.writeheader()
    for mode in document["modes"]:
        table.writerows(
            {key: plain_cell(value) for key, value in {"mode": mode["mode"], **row}.items()}
            for row in mode["surfaces"]
        )
    return text.getvalue()


def write_results(run: CaseRun, target: Path, *, plots: bool = True) -> dict[str, Any]:
    """Write the result folder of a run as a whole and return its summary.

    Raises
    ------
    InputError
        The folder cannot be written or is not a result folder.
    """
    from charging.plots import plot_all

    summaries = case_summaries(run)
    with result_folder(target) as folder:
        audits = []
        for i, mode in enumerate(run.modes):
            found = []
            for member, law in enumerate(mode.laws):
                dataset = mode_dataset(run, mode, member)
                found.append(float(dataset.attrs["charge_audit_relative"]))
                name = result_name(i, law if member else None)
                _save(dataset, folder / name)
                if plots and member == 0:
                    plot_all(dataset, folder if i == 0 else folder / Path(name).stem)
            audits.append(max(found))
        document = summary_document(run, summaries, audits)
        (folder / "surfaces.csv").write_text(surfaces_csv(document), encoding="utf-8")
        text = json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n"
        (folder / "summary.json").write_text(text, encoding="utf-8")
        _flush(folder.rglob("*"))
    return document


def _save(dataset: xr.Dataset, path: Path) -> None:
    try:
        dataset.to_netcdf(path, engine="netcdf4", format="NETCDF4")
    except RuntimeError as error:  # how the HDF library reports a full disk
        raise OSError(str(error)) from error


def _flush(files: Iterable[Path]) -> None:
    """Bring files to the disk before the folder takes its name."""
    for file in files:
        if file.is_file():
            with file.open("rb") as handle:
                os.fsync(handle.fileno())


def _moment(loaded: LoadedCase, peak: Peak) -> str:
    return iso_time(loaded.case.epoch, peak.time_s)


def _moment_of(loaded: LoadedCase, peak: Peak) -> str | None:
    """Time of a difference, null where there never was one."""
    return _moment(loaded, peak) if peak.value else None
