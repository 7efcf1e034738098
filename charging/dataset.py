"""The result of a mode as an xarray dataset that follows CF-1.11.

One table, `VARIABLES`, says what every variable is; writer, checks and
documentation read it.
"""

import hashlib
import json
from collections.abc import Mapping
from pathlib import Path
from typing import NamedTuple

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from charging import __version__
from charging.audit import charge_audit
from charging.case import LoadedCase
from charging.case_mode_checks import span_s
from charging.cautions import cautions
from charging.currents.surface import MECHANISMS, electron_sheath
from charging.errors import InputError
from charging.flight import moments
from charging.jump_rows import jump_rows
from charging.orbit_run import TOLERANCE, CaseRun, ModeRun
from charging.result_plasma import (
    plasma_attributes,
    population_labels,
    population_moments,
    region_attributes,
    region_flags,
)
from charging.result_reader import opened_result, refuse_incomplete
from charging.review.limits import requirements
from charging.spacecraft import surface_materials
from charging.summary import peak_times_s
from charging.surroundings import named_times

Array = NDArray[np.float64]

ALL_MECHANISMS = (*MECHANISMS, "conduction", "bias_or_emitter")


class Variable(NamedTuple):
    """Dimensions, unit and meaning of one variable."""

    dims: tuple[str, ...]
    units: str | None
    long_name: str


VARIABLES: Mapping[str, Variable] = {
    "potential": Variable(("surface", "time"), "V", "surface potential against the plasma"),
    "structure_potential": Variable(("time",), "V", "structure potential against the plasma"),
    "differential_potential": Variable(("surface", "time"), "V", "surface minus structure"),
    "electric_field": Variable(
        ("surface", "time"), "V m-1", "voltage across a dielectric over its thickness, 0 without"
    ),
    "barrier_height": Variable(
        ("surface", "time"),
        "V",
        "height that photo- and secondary electrons must climb to leave",
    ),
    "current_density": Variable(
        ("mechanism", "surface", "time"),
        "A m-2",
        "current density per exposed area, positive charge arriving",
    ),
    "emitter_current": Variable(
        ("time",), "A", "current of all emitters onto structure, positive charge arriving"
    ),
    "string_current": Variable(
        ("time",), "A", "current of all strings onto structure, positive charge arriving"
    ),
    "charge_residual": Variable(
        ("node", "time"), "C", "charge arrived by independent quadrature minus charge stored"
    ),
    "illumination": Variable(("time",), "1", "share of the solar disc in view of the body"),
    "illuminated_fraction": Variable(
        ("surface", "time"), "1", "share of a surface that other parts do not shade"
    ),
    "incidence_cosine": Variable(("surface", "time"), "1", "cosine of the angle of sunlight"),
    "surface_temperature": Variable(("surface", "time"), "K", "temperature of the surface"),
    "position": Variable(("axis", "time"), "m", "position from the Earth's centre, inertial"),
    "sun_direction": Variable(
        ("axis", "time"), "1", "unit vector to the Sun, inertial (fixed case: body axes)"
    ),
    "region": Variable(("time",), None, "light, plasma event, mode and region of space"),
    "population_density": Variable(("population", "time"), "m-3", "number density"),
    "population_temperature": Variable(("population", "time"), "eV", "temperature"),
    "population_current_density": Variable(
        ("population", "time"), "A m-2", "one-sided current density at plasma potential"
    ),
    "electron_debye_length": Variable(("time",), "m", "Debye length of the electrons as printed"),
    "surface_area": Variable(("surface",), "m2", "exposed area"),
}


def mode_dataset(run: CaseRun, mode: ModeRun, member: int = 0) -> xr.Dataset:
    """Evaluate one mode and one emission law at the output times.

    Parameters
    ----------
    run : CaseRun
    mode : ModeRun
    member : int
        Index of the law in ``mode.laws``; 0 is the nominal one.

    Returns
    -------
    xarray.Dataset
        Dimensions surface, time, mechanism, node, population, axis; labels as auxiliary
        coordinates ``surface_name`` and so on (``ds.set_xindex("surface_name")``).
    """
    net, path = mode.net.of(member), mode.trajectories[member]
    # the moments of the extremes belong to the file; times are kept to the nanosecond
    times = np.union1d(mode.times_s, peak_times_s(mode, member))
    times = named_times(run.loaded.case, np.unique(np.rint(times * 1e9)) / 1e9)
    state = path(times)
    node_potential = net.potentials(state)
    surface = node_potential[:, net.surface_node].T
    shot = mode.way.snapshot(times)
    light = shot.light.T
    flows = mode.balance.flows(member, times, state, light, shot.illumination[:, None])
    setting, temperature = mode.around.at(times)

    by_mechanism = np.zeros((len(ALL_MECHANISMS), *surface.shape))
    by_mechanism[: len(MECHANISMS)] = np.moveaxis(flows.surface_A_m2, 0, -1).transpose(1, 0, 2)
    conduction = by_mechanism[ALL_MECHANISMS.index("conduction")]
    conduction[net.film_surface] = flows.film_A_m2.T
    emitted, strung = flows.emitter_A.sum(axis=-1), flows.string_A.sum(axis=-1)
    bonded = net.surface_node == 0
    if bonded.any():  # structure's current, over the faces that are structure
        emitter = by_mechanism[ALL_MECHANISMS.index("bias_or_emitter")]
        emitter[bonded] = (emitted + strung) / net.area_m2[bonded].sum()
    field = np.zeros_like(surface)
    field[net.film_surface] = (state[:, net.film_node] / net.film_thickness_m).T

    audit = charge_audit(mode.balance, member, path)
    residual = np.stack(
        [np.interp(times, audit.ends_s, column, left=0.0) for column in audit.residual_C.T]
    )
    electrons = mode.balance.models[member].electrons
    plasma = population_moments(mode, times, setting)
    values: dict[str, Array | NDArray[np.int16]] = {
        "potential": surface,
        "structure_potential": node_potential[:, 0],
        "differential_potential": surface - node_potential[:, 0],
        "electric_field": field,
        "barrier_height": mode.balance.heights(np.full(len(times), member), state, setting).T,
        "current_density": by_mechanism,
        "emitter_current": emitted,
        "string_current": strung,
        "charge_residual": residual,
        "illumination": shot.illumination,
        "illuminated_fraction": shot.lit_share,
        "incidence_cosine": shot.incidence_cosine,
        "surface_temperature": temperature.T,
        "position": shot.position_m,
        "sun_direction": shot.sun_direction,
        "region": region_flags(mode, times, shot.illumination),
        "population_density": plasma.density_m3,
        "population_temperature": plasma.temperature_eV,
        "population_current_density": plasma.current_A_m2,
        "electron_debye_length": electron_sheath(electrons, setting.strength)[0],
        "surface_area": net.area_m2,
    }
    dataset = xr.Dataset(
        {name: (VARIABLES[name].dims, value) for name, value in values.items()},
        coords={
            "time": moments(run.loaded.case, times),
            "surface_name": ("surface", list(run.loaded.case.names)),
            "mechanism_name": ("mechanism", list(ALL_MECHANISMS)),
            "node_name": ("node", list(net.node_names)),
            "population_name": ("population", population_labels(mode)),
            "axis_name": ("axis", ["x", "y", "z"]),
        },
    )
    dataset.attrs = attributes(run.loaded, mode, member, audit.relative)
    return with_attributes(dataset)


def with_attributes(dataset: xr.Dataset) -> xr.Dataset:
    """Set units, names, flags and encodings from `VARIABLES`; done last, before writing."""
    for name, variable in VARIABLES.items():
        attrs: dict[str, object] = {"long_name": variable.long_name}
        if variable.units is not None:
            attrs["units"] = variable.units
        dataset[name].attrs = attrs
        dataset[name].encoding = {"_FillValue": None}
    regions = json.loads(str(dataset.attrs.get("plasma_regions", "[]")))
    dataset["region"].attrs |= region_attributes(regions)
    for name, text in {
        "surface_name": "name of the surface",
        "mechanism_name": "name of the current",
        "node_name": "name of the node",
        "population_name": "plasma, species and number of the population",
        "axis_name": "name of the axis",
    }.items():
        dataset[name].attrs = {"long_name": text}
    dataset["time"].attrs = {
        "standard_name": "time",
        "long_name": "UTC",
        "axis": "T",
        "units_metadata": "leap_seconds: none",
    }
    first = np.datetime_as_string(dataset["time"].values[0], unit="s")
    dataset["time"].encoding = {
        "units": f"seconds since {str(first).replace('T', ' ')}",
        "calendar": "standard",
        "dtype": "float64",
        "_FillValue": None,
    }
    return dataset


def attributes(
    loaded: LoadedCase, mode: ModeRun, member: int, audit_relative: float
) -> dict[str, object]:
    """Global attributes: with them the run can be repeated from the file alone."""
    return {
        "Conventions": "CF-1.11",
        "title": loaded.case.title,
        "source": f"halflit {__version__}: surface charging by current balance along an orbit",
        # without a date: the same case gives the same file
        "history": f"computed by halflit {__version__} from {loaded.path.name}",
        "comment": (
            "An estimate. Program requirements, applicable standards and qualified specialists "
            "decide; crewed use needs its own safety process. Not modelled: internal charging, "
            "discharge transients, plumes, electron exchange between surfaces, surface "
            "conduction."
        ),
        "halflit_version": __version__,
        "mode": mode.name,
        "secondary_law": mode.laws[member],
        "backscatter_law": "prokopenko_laframboise_1980",
        "ion_impact_law": "whipple_1981",
        "conduction_law": "Arrhenius with adamec_calderwood_1981",
        "photoyield": json.dumps(photoyields(loaded), ensure_ascii=False),
        "case_file": loaded.path.name,
        "case_text": loaded.text,
        "case_sha256": loaded.sha256,
        **_texts("material", loaded.material_texts),
        **_texts("plasma", loaded.plasma_texts),
        "file_texts": json.dumps(dict(loaded.files.texts), ensure_ascii=False, sort_keys=True),
        "file_sha256": json.dumps(dict(loaded.files.sha256), ensure_ascii=False, sort_keys=True),
        "file_comment": _kept(loaded),
        "orbit_source": "fixed light"
        if mode.way.trajectory is None
        else mode.way.trajectory.source,
        "attitude": "; ".join(dict.fromkeys(leg.attitude.law for leg in mode.way.legs)),
        "mode_spans": json.dumps(
            [
                {"name": one.name, "start_s": start, "end_s": end}
                for one in loaded.case.mode
                if not one.alternative
                for start, end in [span_s(loaded.case, one)]
            ],
            ensure_ascii=False,
        ),
        **plasma_attributes(mode),
        "seeds": "none",
        "march_method": f"{TOLERANCE.method.name}, dense output",
        "march_absolute_tolerance_V": TOLERANCE.absolute,
        "march_relative_tolerance": TOLERANCE.relative,
        "march_steps": len(mode.trajectories[member].step_s),
        "march_attempts": mode.trajectories[member].attempts,
        "branch_jumps": json.dumps(jump_rows(loaded, mode, member), ensure_ascii=False),
        "charge_audit_relative": audit_relative,
        "limits": json.dumps(
            [
                {
                    "kind": r.kind,
                    "limit": r.limit,
                    "surfaces": r.surfaces,
                    "requirement_id": r.requirement_id,
                }
                for r in requirements(loaded.case)
            ]
        ),
        "warnings": "\n".join(cautions(loaded, mode)) or "none",
    }


def photoyields(loaded: LoadedCase) -> list[dict[str, object]]:
    """How each surface emits in sunlight: state, level and basis of its curve, energies."""
    used = surface_materials(loaded.case, loaded.materials)
    rows: list[dict[str, object]] = []
    for surface, material in zip(loaded.case.surface, used, strict=True):
        curve = material.photoyield
        row: dict[str, object] = {"surface": surface.name, "state": surface.surface_state}
        if curve is not None:
            row |= {
                "threshold_eV": curve.threshold_eV,
                "level": curve.level,
                "basis": curve.basis,
                "spread_factor": curve.spread_factor,
                "electron_energies": "photons" if curve.energies is None else curve.energies.law,
                "note": curve.note,
            }
        rows.append(row)
    return rows


def _texts(kind: str, texts: Mapping[str, str]) -> dict[str, object]:
    return {
        f"{kind}_texts": json.dumps(dict(texts), ensure_ascii=False, sort_keys=True),
        f"{kind}_sha256": json.dumps(
            {name: hashlib.sha256(text.encode()).hexdigest() for name, text in texts.items()},
            ensure_ascii=False,
            sort_keys=True,
        ),
    }


def _kept(loaded: LoadedCase) -> str:
    absent = sorted(set(loaded.files.sha256) - set(loaded.files.texts))
    if not absent:
        return "this file holds all that a rerun needs"
    return f"a rerun also needs {', '.join(absent)}, binary: not held here"


def read_result(path: Path) -> xr.Dataset:
    """Read a result file into memory.

    Raises
    ------
    InputError
        No such file, a folder without result.nc, or not a result of this program.
    """
    if path.is_dir() and (path / "result.nc").is_file():
        path = path / "result.nc"
    if not path.is_file():
        reason = "is a folder without result.nc" if path.is_dir() else "does not exist"
        raise InputError(reason, file=str(path), allowed="a result folder or its result.nc")
    dataset = opened_result(path)
    refuse_incomplete(dataset, path, VARIABLES)
    return dataset
