"""A case along its orbit: from a loaded case to potentials in time."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from charging.case import Case, LoadedCase, Mode, OrbitFixed
from charging.currents.emission import SECONDARY_LAWS
from charging.currents.lookup import net_currents
from charging.currents.surface import Setting, surface_models
from charging.errors import NoSolutionError
from charging.network.charge_balance import Around, ChargeBalance
from charging.network.march import Tolerance, Trajectory, march
from charging.network.nodes import Network
from charging.spacecraft import spacecraft_network, surface_materials
from charging.surroundings import (
    Episode,
    Path,
    Surroundings,
    kepler,
    output_times,
    path,
    sun_distance_au,
    surroundings,
)
from environments.orbit import period_s
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
        Base plasma first, then one per event.
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
    alternatives: Sequence[Mode | None] = [None, *loaded.case.mode]
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


def plasma_names(loaded: LoadedCase, mode: Mode | None) -> tuple[str, ...]:
    """Plasmas of a mode as the case names them: base, then one per event."""
    table = loaded.case.plasma
    base = table.use if mode is None or mode.plasma is None else mode.plasma
    with_events = mode is None or mode.events
    return (base, *(event.use for event in table.event if with_events))


def solve_mode(loaded: LoadedCase, mode: Mode | None = None) -> ModeRun:
    """Solve one mode of a case for all its emission laws.

    Raises
    ------
    NoSolutionError
        The march found no step; the message names mode and time.
    """
    case = loaded.case
    names = plasma_names(loaded, mode)
    plasmas = tuple(loaded.plasmas[name] for name in names)
    episodes = [
        Episode(onset, 60.0 * e.rise_min, 60.0 * e.hold_min, 60.0 * e.decay_min, 1 + i)
        for i, (onset, e) in enumerate(zip(case.event_onset_s, case.plasma.event, strict=True))
    ]
    around = surroundings(case, mode, episodes[: len(plasmas) - 1])
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
    balance = ChargeBalance(models, net_currents(models), net, around, net.mass)
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
            largest_step_s=_largest_step_s(case),
        )
    except NoSolutionError as error:
        raise NoSolutionError(f"mode {name!r}: {error}") from error
    return ModeRun(
        name=name,
        laws=laws,
        balance=balance,
        around=around,
        way=path(case, mode),
        plasmas=plasmas,
        spectrum=spectrum,
        times_s=output_times(case, around),
        trajectories=tuple(trajectories),
    )


def _largest_step_s(case: Case) -> float:
    if isinstance(case.orbit, OrbitFixed):
        return np.inf
    return LARGEST_TURN * period_s(kepler(case.orbit))


@dataclass(frozen=True, slots=True)
class _Frozen:
    """Surroundings that stay as they are at the start."""

    around: Around

    def at(self, time_s: Array) -> tuple[Setting, Array]:
        return self.around.at(np.zeros_like(time_s))


def settled(balance: ChargeBalance, start: Array) -> Array:
    """State [M, n] reached from `start` when the first moment lasts for ever."""
    still = ChargeBalance(
        balance.models, balance.table, balance.net, _Frozen(balance.around), balance.mass
    )
    reached = march(
        still,
        start,
        span_s=(0.0, SETTLING_S),
        tolerance=TOLERANCE,
        first_step_s=FIRST_STEP_S,
    )
    return np.stack([trajectory.y_end[-1] for trajectory in reached])
