"""Two reviews side by side: what changed in the inputs, what moved in the verdict."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from charging.case import LoadedCase
from charging.review.check import Options, load_case_or_result, review_case
from charging.review.document import review_document
from charging.review.provenance import run_hash

STILL = 1e-3
"""Share of the limit by which a value must move to be listed."""


@dataclass(frozen=True, slots=True)
class Reviewed:
    """Inputs and review of one side."""

    loaded: LoadedCase
    document: Mapping[str, Any]


def reviewed(
    path: Path, *, allow_outside: bool = False, options: Options | None = None
) -> Reviewed:
    """Load one side; its review.json is used where it belongs to the same inputs and code.

    Raises
    ------
    InputError
        No case and no result.
    """
    loaded = load_case_or_result(path, allow_outside=allow_outside)
    kept = _kept(path, loaded)
    if kept is not None:
        return Reviewed(loaded, kept)
    options = options or Options(fixes=False)
    if options.notes is not None:
        options.notes(f"{path}: no review of these inputs by this program there, so it runs now")
    review = review_case(loaded, options)
    return Reviewed(loaded, review_document(review))


def _kept(path: Path, loaded: LoadedCase) -> Mapping[str, Any] | None:
    file = path if path.suffix == ".json" else (path / "review.json" if path.is_dir() else None)
    if file is None or not file.is_file():
        return None
    try:
        document = json.loads(file.read_text(encoding="utf-8"))
        same = document["run_hash"] == run_hash(loaded, document["settings"])
    except (OSError, ValueError, KeyError, TypeError):
        return None
    return document if same else None


def compare(before: Reviewed, after: Reviewed) -> dict[str, Any]:
    """Document of two sides.

    Returns
    -------
    dict
        ``inputs`` [{input, before, after}], ``verdict`` {before, after}, ``limits`` [{surface,
        against, kind, requirement_id, unit, before, after, allowed_before, allowed_after,
        verdict_before, verdict_after}] of what moved, ``unmoved``.
    """
    inputs = list(_inputs(before.loaded, after.loaded))
    if before.document["hashes"]["code"] != after.document["hashes"]["code"]:
        inputs.append(_changed("program code", before.document["hashes"]["code"][:12],
                               after.document["hashes"]["code"][:12]))  # fmt: skip
    for key in ("draws", "seed", "corners"):
        pair = before.document["settings"][key], after.document["settings"][key]
        if pair[0] != pair[1]:
            inputs.append(_changed(f"review {key}", *pair))
    rows = {_key(one): one for one in before.document["limits"]}
    later = {_key(one): one for one in after.document["limits"]}
    moved, unmoved = [], 0
    for row in dict.fromkeys((*rows, *later)):
        one, two = rows.get(row), later.get(row)
        if one is not None and two is not None and not _moves(one, two):
            unmoved += 1
            continue
        moved.append(_pair(row, one, two))
    moved.sort(key=lambda row: -row["change"])
    return {
        "title": {"before": before.document["title"], "after": after.document["title"]},
        "inputs": inputs,
        "verdict": {"before": before.document["verdict"], "after": after.document["verdict"]},
        "limits": moved,
        "unmoved": unmoved,
    }


def _key(row: Mapping[str, Any]) -> tuple[str, str, str, str]:
    return row["surface"], row["against"], row["kind"], row["requirement_id"]


def _moves(one: Mapping[str, Any], two: Mapping[str, Any]) -> bool:
    if one["verdict"] != two["verdict"] or one["allowed"] != two["allowed"]:
        return True
    return bool(abs(one["value"] - two["value"]) > STILL * max(one["allowed"], two["allowed"]))


def _pair(
    key: tuple[str, str, str, str], one: Mapping[str, Any] | None, two: Mapping[str, Any] | None
) -> dict[str, Any]:
    def of(row: Mapping[str, Any] | None, name: str) -> Any:
        return None if row is None else row[name]

    shares = [abs(row["value"]) / row["allowed"] if row else 0.0 for row in (one, two)]
    any_row = one or two
    assert any_row is not None
    return {
        "surface": key[0],
        "against": key[1],
        "kind": key[2],
        "requirement_id": key[3],
        "unit": any_row["unit"],
        "before": of(one, "value"),
        "after": of(two, "value"),
        "allowed_before": of(one, "allowed"),
        "allowed_after": of(two, "allowed"),
        "verdict_before": of(one, "verdict"),
        "verdict_after": of(two, "verdict"),
        "change": abs(shares[1] - shares[0]),
    }


def _inputs(before: LoadedCase, after: LoadedCase) -> Iterator[dict[str, Any]]:
    one, two = (_flat(tomllib.loads(loaded.text)) for loaded in (before, after))
    yield from _differences("", one, two)
    for what in ("material", "plasma"):
        texts = [dict(getattr(loaded, f"{what}_texts")) for loaded in (before, after)]
        for name in dict.fromkeys((*texts[0], *texts[1])):
            if name in texts[0] and name in texts[1] and texts[0][name] != texts[1][name]:
                pair = [_flat(tomllib.loads(text[name])) for text in texts]
                yield from _differences(f'{what} "{name}": ', *pair)
    sums = [dict(loaded.files.sha256) for loaded in (before, after)]
    for name in dict.fromkeys((*sums[0], *sums[1])):
        if sums[0].get(name) != sums[1].get(name):
            short = [s[name][:12] if name in s else None for s in sums]
            yield _changed(f"file {name}, SHA-256", *short)


def _differences(
    head: str, one: Mapping[str, Any], two: Mapping[str, Any]
) -> Iterator[dict[str, Any]]:
    for key in dict.fromkeys((*one, *two)):
        if one.get(key) != two.get(key):
            yield _changed(f"{head}{key}", one.get(key), two.get(key))


def _changed(name: str, before: Any, after: Any) -> dict[str, Any]:
    return {"input": name, "before": before, "after": after}


def _flat(value: Any, path: str = "") -> dict[str, Any]:
    """Entries of a document by readable paths; entries of lists by their name where they have one.

    Examples
    --------
    >>> _flat({"a": 1, "surface": [{"name": "x", "area_m2": 2.0}]})
    {'a': 1, 'surface "x" name': 'x', 'surface "x" area_m2': 2.0}
    """
    if isinstance(value, dict):
        found: dict[str, Any] = {}
        for key, inner in value.items():
            found |= _flat(inner, f"{path} {key}".strip())
        return found
    if isinstance(value, list) and value and all(isinstance(item, dict) for item in value):
        found = {}
        for number, item in enumerate(value):
            name = f'"{item["name"]}"' if "name" in item else str(number + 1)
            found |= _flat(item, f"{path} {name}")
        return found
    return {path: value if isinstance(value, int | float | str | bool | list) else str(value)}
