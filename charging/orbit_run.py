"""A case along its orbit: from a loaded case to potentials in time."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.case import Case, LoadedCase, Mode
from charging.currents.emission import SECONDARY_LAWS
from charging.currents.lookup import net_currents
from charging.currents.surface import Setting, surface_models
from charging.errors import NoSolutionError
from charging.flight import Path, path, revolution_s, sun_distance_au
from charging.network.charge_balance import Around, ChargeBalance
from charging.network.emitters import Emitters
from charging.network.march import Tolerance, Trajectory, march
from charging.network.nodes import Network
from charging.schedule import plasma_names
from charging.spacecraft import spacecraft_network, surface_materials
from charging.surroundings import Episode, Surroundings, output_times, surroundings
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum, solar_spectrum
from materials.secondary import YieldLaw

Array = NDArray[np.float64]

TOLERANCE = Tolerance(absolute=0.005, relative=5e-5)
"""Local error per step [V] and relative; what it gives along a day is a recorded figure."""

FIRST_STEP_S = 1e-6
LARGEST_TURN = 1.0 / 48.0
"""Longest step as a share of the orbit's period: 7.5 degrees of Sun angle."""

SETTLING_S = 1e12
"""Length of the march with frozen surroundings that finds an equilibrium start."""


@dataclass(frozen=True, slots=True)
class ModeRun:
    """One mode of a case, solved for one or more secondary-emission laws.

    Attributes
    ----------
    name : str
        Mode; "base" for the case as it stands.
    laws : tuple of YieldLaw
        One member each; the first is the nominal one.
    balance : ChargeBalance
    around : Surroundings
    way : Path
    plasmas : tuple of Plasma
        Base plasma first, then one per event, then those of interval modes.
    spectrum : SolarSpectrum
    times_s : ndarray [T]
        Output times after the start.
    trajectories : tuple of Trajectory
        One per law.
    """

    name: str
    laws: tuple[YieldLaw, ...]
    balance: ChargeBalance
    around: Surroundings
    way: Path
    plasmas: tuple[Plasma, ...]
    spectrum: SolarSpectrum
    times_s: Array
    trajectories: tuple[Trajectory, ...]

    @property
    def net(self) -> Network:
        """Nodes and capacitances."""
        return self.balance.net

    def plasma_at(self, time_s: float) -> Plasma:
        """Plasma with the largest share at a time after the start."""
        return self.plasmas[int(np.argmax(self.around.strength(np.array(time_s))))]


@dataclass(frozen=True, slots=True)
class CaseRun:
    """A whole case: the base and every alternative mode."""

    loaded: LoadedCase
    modes: tuple[ModeRun, ...]


def run_case(loaded: LoadedCase) -> CaseRun:
    """Solve a case in every mode.

    Parameters
    ----------
    loaded : LoadedCase
        From `charging.case.load_case`.

    Returns
    -------
    CaseRun
        The base first, then the alternative modes in the order of the file.

    Raises
    ------
    NoSolutionError
        The march found no step.
    """
    alternatives: Sequence[Mode | None] = [None, *loaded.case.alternatives]
    return CaseRun(loaded, tuple(solve_mode(loaded, mode) for mode in alternatives))


def laws_of(loaded: LoadedCase) -> tuple[YieldLaw, ...]:
    """Secondary-emission laws of a case; the nominal one first."""
    wanted = loaded.case.emission.secondary_law
    return SECONDARY_LAWS if wanted == "both" else (wanted,)


def spectrum_of(loaded: LoadedCase, mode: Mode | None = None) -> SolarSpectrum:
    """Solar spectrum at the spacecraft in a mode of a case."""
    sun = loaded.case.sun
    f107, mean = sun.f107, sun.f107_81day
    if mode is not None and mode.f107 is not None:
        f107 = mean = mode.f107
    return solar_spectrum(
        f107=f107,
        f107_81day=mean,
        distance_au=sun_distance_au(loaded.case),
        band_factors={str(band): factor for band, factor in sun.flare.items()},
    )


def solve_mode(loaded: LoadedCase, mode: Mode | None = None) -> ModeRun:
    """Solve one mode of a case for all its emission laws.

    Raises
    ------
    NoSolutionError
        The march found no step; the message names mode and time.
    """
    case = loaded.case
    names = plasma_names(case, mode)
    plasmas = tuple(loaded.plasmas[name] for name in names)
    episodes = [
        Episode(onset, 60.0 * e.rise_min, 60.0 * e.hold_min, 60.0 * e.decay_min, 1 + i)
        for i, (onset, e) in enumerate(zip(case.event_onset_s, case.plasma.event, strict=True))
    ]
    if mode is not None and not mode.events:
        episodes = []
    around = surroundings(case, mode, episodes, loaded.files)
    spectrum = spectrum_of(loaded, mode)
    net = spacecraft_network(case, loaded.materials)
    laws = laws_of(loaded)
    materials = surface_materials(case, loaded.materials)
    models = surface_models(
        materials,
        plasmas,
        spectrum,
        laws=laws,
        radius_m=case.body.radius_m,
        collection=case.body.collection,
        photo_geometry=case.emission.photo_escape,
    )
    balance = ChargeBalance(models, net_currents(models), net, around, net.mass, emitters_of(case))
    way = path(case, mode, loaded.files)
    name = "base" if mode is None else mode.name
    start = np.zeros((len(laws), len(net.node_names)))
    try:
        if case.time.start == "equilibrium":
            start = settled(balance, start)
        trajectories = march(
            balance,
            start,
            span_s=(0.0, case.duration_s),
            breaks_s=around.breaks_s,
            tolerance=TOLERANCE,
            first_step_s=FIRST_STEP_S,
            largest_step_s=_largest_step_s(way),
        )
    except NoSolutionError as error:
        raise NoSolutionError(f"mode {name!r}: {error}") from error
    return ModeRun(
        name=name,
        laws=laws,
        balance=balance,
        around=around,
        way=way,
        plasmas=plasmas,
        spectrum=spectrum,
        times_s=output_times(case, around),
        trajectories=tuple(trajectories),
    )


def emitters_of(case: Case) -> Emitters:
    """Emitters of a case, for the charge balance."""
    return Emitters(
        tuple(one.name for one in case.emitter),
        np.array([one.current_A for one in case.emitter]),
        np.array([one.energy_eV for one in case.emitter]),
    )


def _largest_step_s(way: Path) -> float:
    if way.trajectory is None:
        return np.inf
    step = LARGEST_TURN * revolution_s(way.trajectory, way.case.duration_s)
    for leg in way.legs:
        if leg.attitude.resolved and leg.attitude.period_s is not None:
            step = min(step, LARGEST_TURN * leg.attitude.period_s)
    return step


@dataclass(frozen=True, slots=True)
class _Frozen:
    """Surroundings that stay as they are at the start."""

    around: Around

    def at(self, time_s: Array) -> tuple[Setting, Array]:
        return self.around.at(np.zeros_like(time_s))

    def emitting(self, time_s: Array) -> Array:
        return self.around.emitting(np.zeros_like(time_s))


def settled(balance: ChargeBalance, start: Array) -> Array:
    """State [M, n] reached from `start` when the first moment lasts for ever."""
    still = ChargeBalance(
        balance.models,
        balance.table,
        balance.net,
        _Frozen(balance.around),
        balance.mass,
        balance.emitters,
    )
    reached = march(
        still,
        start,
        span_s=(0.0, SETTLING_S),
        tolerance=TOLERANCE,
        first_step_s=FIRST_STEP_S,
    )
    return np.stack([trajectory.y_end[-1] for trajectory in reached])
