"""review.json and report.html on the disk."""

from __future__ import annotations

import json
import os
from pathlib import Path
from typing import Any

from charging.errors import InputError
from charging.result_folder import check_target
from charging.review.check import Review
from charging.written_file import written_file


def review_target(case: Path, out: Path | None) -> Path:
    """Folder for the files of a review, refused before any work when it cannot be used.

    Raises
    ------
    InputError
        The folder belongs to something else, or cannot be written.
    """
    if out is not None:
        target = out
    elif case.is_dir():
        target = case
    elif case.suffix in (".nc", ".json"):
        target = case.parent
    else:
        target = Path(case.stem)
    if out is not None or case.suffix == ".toml":
        check_target(target)
    return target


def write_review(review: Review, document: dict[str, Any], target: Path) -> list[Path]:
    """Write report.html and review.json, each as a whole.

    Raises
    ------
    InputError
        The place cannot be written.
    """
    from charging.review.report import report_html

    page = report_html(review, document)
    text = json.dumps(
        {**document, "inputs": inputs(review)}, indent=1, ensure_ascii=False, allow_nan=False
    )
    try:
        target.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        reason = os.strerror(error.errno) if error.errno else str(error)
        raise InputError(
            f"--out {target}: cannot be written ({reason})", allowed="a writable place"
        ) from None
    written = []
    for name, content in (("review.json", text + "\n"), ("report.html", page)):
        with written_file(target / name, option="--out") as scratch:
            scratch.write_text(content, encoding="utf-8")
        written.append(target / name)
    return written


def inputs(review: Review) -> dict[str, Any]:
    """Texts of case, materials, plasmas and files: with them the review can be run again."""
    loaded = review.loaded
    return {
        "case_file": loaded.path.name,
        "case_text": loaded.text,
        "material_texts": dict(loaded.material_texts),
        "plasma_texts": dict(loaded.plasma_texts),
        "file_texts": dict(loaded.files.texts),
        "file_sha256": dict(loaded.files.sha256),
    }
