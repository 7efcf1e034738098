"""The picture of a case with shapes at one moment."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from charging.case import LoadedCase
from charging.clock import iso_time
from charging.errors import InputError, printable
from charging.flight import epoch64, path
from charging.shape.picture import shape_picture
from charging.shape.views import wings_of
from environments.timescales import elapsed_s


def picture_at(
    loaded: LoadedCase, target: Path, *, at: str | None = None, result: Path | None = None
) -> Path:
    """Draw the shapes of a case as they stand at a moment.

    Parameters
    ----------
    loaded : LoadedCase
    target : Path
        .png, .svg or .pdf.
    at : str, optional
        UTC with Z; default: the start, or the worst moment of a result, when one surface
        differs most from structure.
    result : Path, optional
        Result folder or file, whose potentials colour the picture.

    Raises
    ------
    InputError
        No such moment in the run, no result, file not writable.
    """
    case = loaded.case
    time_s, potential, structure = 0.0, None, 0.0
    if at is not None:
        time_s = _seconds(loaded, at)
    words = []
    if result is not None:
        from charging.dataset import read_result

        dataset = read_result(result)
        apart = np.abs(dataset["differential_potential"].values)
        stamps = dataset["time"].values
        if at is None:
            k = int(np.argmax(apart.max(axis=0)))
        else:
            wanted = epoch64(case) + np.timedelta64(round(time_s * 1e9), "ns")
            k = int(np.argmin(np.abs(stamps - wanted)))
        time_s = float(elapsed_s(epoch64(case), stamps[k]))
        names = [str(name) for name in dataset["surface_name"].values]
        potential = dict(zip(names, dataset["potential"].values[:, k].tolist(), strict=True))
        structure = float(dataset["structure_potential"].values[k])
        worst = names[int(np.argmax(apart[:, k]))]
        words.append(f"largest difference to structure: {worst}")
    way = path(case, None, loaded.files)
    sun, illumination, leg = way.sun_in_body(time_s)
    if illumination <= 0.0:
        sun = np.zeros(3)
    words.insert(0, "umbra" if illumination <= 0.0 else f"{100.0 * illumination:.3g} % of the Sun")
    return shape_picture(
        case,
        target,
        sun_body=sun,
        wings=wings_of(leg),
        potential_V=potential,
        structure_V=structure,
        caption=f"{iso_time(case.epoch, time_s)}, {'; '.join(words)}",
    )


def _seconds(loaded: LoadedCase, at: str) -> float:
    case = loaded.case
    allowed = f"{iso_time(case.epoch, 0.0)} to {iso_time(case.epoch, case.duration_s)}"
    try:
        if not at.endswith("Z"):
            raise ValueError
        moment = np.datetime64(at.removesuffix("Z"), "ns")
        time_s = float(elapsed_s(epoch64(case), moment))
        if not 0.0 <= time_s <= case.duration_s:
            raise ValueError
    except ValueError:
        raise InputError(
            f'--at "{printable(at)}": is no moment of the run', key=("at",), value=at,
            allowed=allowed,
        ) from None  # fmt: skip
    return time_s
