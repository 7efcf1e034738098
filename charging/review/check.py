"""The differential-charging check: every surface, limit, mode and plasma of a case."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from charging.case import LoadedCase, Mode, load_case, load_case_text
from charging.errors import InputError
from charging.orbit_run import solve_mode
from charging.results import limit_row, sentences
from charging.review.limits import Verdict
from charging.summary import mode_summary, worst


@dataclass(frozen=True, slots=True)
class Review:
    """Verdict of a case, its rows (JSON keys of ``halflit review``) and sentences."""

    title: str
    verdict: Verdict
    rows: tuple[dict[str, Any], ...]
    sentences: tuple[str, ...]


def review_case(loaded: LoadedCase) -> Review:
    """Run every mode of a case and every plasma its ``[review]`` names, and judge them.

    A plasma of ``[review]`` replaces the case's own for the whole run, without events.
    Properties are those of the files as they stand (begin of life).

    Raises
    ------
    NoSolutionError
        The march found no step.
    """
    extra = [
        Mode(name="base", alternative=True, plasma=name, events=False)
        for name in loaded.case.review.plasmas
    ]
    rows: list[dict[str, Any]] = []
    said: list[str] = []
    verdicts: list[Verdict] = []
    for mode in (None, *loaded.case.alternatives, *extra):
        solved = solve_mode(loaded, mode)
        summary = mode_summary(loaded, solved)
        verdicts.append(summary.verdict)
        rows += [limit_row(loaded, solved, judgement) for judgement in summary.judgements]
        said += sentences(loaded, solved, summary)
    rows.sort(key=lambda row: row["margin"] / row["allowed"])
    return Review(loaded.case.title, worst(verdicts), tuple(rows), tuple(said))


def load_case_or_result(path: Path, *, allow_outside: bool = False) -> LoadedCase:
    """Load a case file, or the case kept inside a result file or folder."""
    import json

    if path.is_dir() and (path / "result.nc").is_file():
        path = path / "result.nc"
    if path.suffix != ".nc":
        return load_case(path, allow_outside=allow_outside)
    from charging.dataset import read_result

    attributes = read_result(path).attrs
    missing = [k for k in ("case_text", "material_texts", "plasma_texts") if k not in attributes]
    if missing:
        raise InputError(f"no attribute {missing[0]}, so this is no result", file=str(path))
    return load_case_text(
        attributes["case_text"],
        file=f"{path}: case_text",
        material_texts=json.loads(attributes["material_texts"]),
        plasma_texts=json.loads(attributes["plasma_texts"]),
        file_texts=json.loads(attributes.get("file_texts", "{}")),
        file_sha256=json.loads(attributes.get("file_sha256", "{}")),
    )
