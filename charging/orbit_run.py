"""A case along its orbit: from a loaded case to potentials in time."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from charging.case import Case, LoadedCase, Mode
from charging.clock import iso_time
from charging.currents.emission import SECONDARY_LAWS
from charging.currents.ensemble import EscapeCurves
from charging.currents.surface import Setting
from charging.errors import NoSolutionError
from charging.flight import Path, angular_speed_rad_s, path, revolution_s, sun_distance_au
from charging.members import Member, block_balance, member_of
from charging.network.charge_balance import Around, ChargeBalance
from charging.network.jumps import Jump, branch_jumps
from charging.network.march import Record, StuckError, Tolerance, Trajectory, march
from charging.network.nodes import Network
from charging.network.rosenbrock import RODAS3
from charging.surroundings import Episode, Surroundings, output_times, surroundings
from environments.plasma import Plasma
from environments.spectrum import SolarSpectrum, solar_spectrum
from materials.secondary import YieldLaw

Array = NDArray[np.float64]

TOLERANCE = Tolerance(absolute=0.002, relative=2e-5)
"""Local error per step [V] and relative; what it gives along a day is a recorded figure."""

ENSEMBLE_TOLERANCE = Tolerance(absolute=0.05, relative=5e-4, method=RODAS3)
"""For many members on coarse tables: worst differentials within 1 V or 1 percent."""

FIRST_STEP_S = 1e-6
LARGEST_TURN = 1.0 / 48.0
"""Longest step as a share of the orbit's period: 7.5 degrees of Sun angle."""

LARGEST_TURN_IN_REGIONS = 1.0 / 360.0
"""The same where the plasma changes along the orbit, by 1 degree, as thick as an auroral arc."""

SETTLING_S, SETTLING_ATTEMPTS = 1e12, 20_000
"""Length of the march with frozen surroundings that finds an equilibrium, and its tries."""


@dataclass(frozen=True, slots=True)
class ModeRun:
    """One mode of a case, solved for one or more members.

    Attributes
    ----------
    name : str
        Mode; "base" for the case as it stands.
    members : tuple of Member
        Where none are given, one per secondary-emission law, the nominal one first.
    balance : ChargeBalance
    around : Surroundings
    way : Path
    plasmas : tuple of Plasma
        Base plasma first, then one per event, then those of interval modes; of the first member.
    spectrum : SolarSpectrum
        Of the first member.
    times_s : ndarray [T]
        Output times after the start.
    trajectories : tuple of Trajectory
        One per member.
    """

    name: str
    members: tuple[Member, ...]
    balance: ChargeBalance
    around: Surroundings
    way: Path
    plasmas: tuple[Plasma, ...]
    spectrum: SolarSpectrum
    times_s: Array
    trajectories: tuple[Trajectory, ...]

    @property
    def laws(self) -> tuple[YieldLaw, ...]:
        """Secondary-emission law of each member."""
        return tuple(member.law for member in self.members)

    @property
    def net(self) -> Network:
        """Nodes and capacitances, with a member axis where members differ."""
        return self.balance.net

    @property
    def whole_plasmas(self) -> tuple[Plasma, ...]:
        """Plasmas of the run that are no parts of the one along the orbit."""
        return self.plasmas[len(self.around.basis) :]

    @property
    def assumed(self) -> tuple[str, ...]:
        """Names of the plasmas that rest on assumed figures."""
        along = self.around.along
        changing = () if along is None or not along.assumed else (along.name,)
        own = [p.name for p in dict.fromkeys(self.whole_plasmas) if p.basis == "assumed"]
        return (*changing, *own)

    def jumps(self, member: int) -> tuple[Jump, ...]:
        """Jumps between branches of one member, in order."""
        return branch_jumps(self.balance, member, self.trajectories[member])

    def plasma_at(self, time_s: float) -> str:
        """Name of the plasma with the largest share at a time after the start.

        Along an orbit: of the region.
        """
        share = self.around.strength(np.array(time_s))
        along = self.around.along
        if along is None:
            return self.plasmas[int(np.argmax(share))].name
        own = len(along.basis)
        if share[own:].sum() > 0.5:
            return self.plasmas[own + int(np.argmax(share[own:]))].name
        return along.name_at(time_s)


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


def spectrum_of(case: Case, mode: Mode | None = None) -> SolarSpectrum:
    """Solar spectrum at the spacecraft in a mode of a case."""
    sun = case.sun
    f107, mean = sun.f107, sun.f107_81day
    if mode is not None and mode.f107 is not None:
        f107 = mean = mode.f107
    return solar_spectrum(
        f107=f107,
        f107_81day=mean,
        distance_au=sun_distance_au(case),
        band_factors={str(band): factor for band, factor in sun.flare.items()},
    )


def surroundings_of(loaded: LoadedCase, mode: Mode | None = None) -> Surroundings:
    """Surroundings of a mode of a case; one table serves any number of members."""
    case = loaded.case
    episodes = [
        Episode(onset, 60.0 * e.rise_min, 60.0 * e.hold_min, 60.0 * e.decay_min, 1 + i)
        for i, (onset, e) in enumerate(zip(case.event_onset_s, case.plasma.event, strict=True))
    ]
    if mode is not None and not mode.events:
        episodes = []
    return surroundings(case, mode, episodes, loaded.files, loaded.plasmas)


def solve_mode(
    loaded: LoadedCase,
    mode: Mode | None = None,
    *,
    members: Sequence[Member] | None = None,
    around: Surroundings | None = None,
    tolerance: Tolerance = TOLERANCE,
    curves: EscapeCurves | None = None,
    record: Callable[[ChargeBalance, Array], Record] | None = None,
) -> ModeRun:
    """Solve one mode of a case for a block of members.

    Parameters
    ----------
    loaded : LoadedCase
        Gives orbit, attitude, timeline and surface temperatures.
    mode : Mode, optional
        An alternative mode; default: the case as it stands.
    members : sequence of Member, optional
        Default: the case as it stands with each of its emission laws.
    around : Surroundings, optional
        From `surroundings_of` for the same case and mode, where several blocks share it.
    tolerance : Tolerance, optional
    curves : EscapeCurves, optional
        As in `block_balance`: coarse tables for an ensemble.
    record : callable, optional
        Makes a `Record` of the balance and the starting states, for example
        ``lambda balance, start: Peaks(balance.controlled, start)``; the run then keeps no
        trajectories.

    Raises
    ------
    NoSolutionError
        The march found no step; the message names mode and time.
    ValueError
        Members have not the same nodes or as many plasmas.
    """
    case = loaded.case
    if members is None:
        members = [member_of(loaded, law) for law in laws_of(loaded)]
    if around is None:
        around = surroundings_of(loaded, mode)
    by_sun: dict[object, SolarSpectrum] = {}
    spectra = []
    for member in members:
        key = (member.case.sun.model_dump_json(), sun_distance_au(member.case))
        if key not in by_sun:
            by_sun[key] = spectrum_of(member.case, mode)
        spectra.append(by_sun[key])
    balance = block_balance(members, spectra, mode, around, curves=curves)
    way = path(case, mode, loaded.files)
    name = "base" if mode is None else mode.name
    start = np.zeros((len(members), len(balance.net.node_names)))
    try:
        if case.time.start == "equilibrium":
            start = settled(balance, start, tolerance)
        trajectories = march(
            balance,
            start,
            span_s=(0.0, case.duration_s),
            breaks_s=around.breaks_s,
            tolerance=tolerance,
            first_step_s=FIRST_STEP_S,
            largest_step_s=_largest_step_s(way),
            record=None if record is None else record(balance, start),
        )
    except StuckError as error:
        raise no_solution(loaded, name, members[error.member], balance, error) from error
    return ModeRun(
        name=name,
        members=tuple(members),
        balance=balance,
        around=around,
        way=way,
        plasmas=members[0].plasmas_of(mode, around.basis),
        spectrum=spectra[0],
        times_s=output_times(case, around),
        trajectories=tuple(trajectories),
    )


def no_solution(
    loaded: LoadedCase, mode: str, member: Member, balance: ChargeBalance, error: StuckError
) -> NoSolutionError:
    """What stopped a march, for the user: time, surface, residual, what to try."""
    case = loaded.case
    which, net = np.array([error.member]), balance.net
    y = error.state[None]
    mass = balance.mass if balance.mass.ndim == 2 else balance.mass[error.member]
    rate = balance.rhs(which, np.array([error.time_s]), y)[0]
    try:
        moving = net.potentials(np.linalg.solve(mass, rate))
    except np.linalg.LinAlgError:
        moving = rate
    volts = net.potentials(y)[0]
    node = int(np.argmax(np.abs(moving)))
    name = net.node_names[node]
    time = iso_time(case.epoch, error.time_s)
    surface = next((s for s in case.surface if s.name == name), case.surface[0])
    plasma = member.plasmas_of(None)[0].name
    left = "left the range of the tables" if np.isinf(error.error) else (
        f"erred by {error.error:.2g} times what is allowed"
    )  # fmt: skip
    return NoSolutionError(
        f'mode "{mode}", law {member.law}: no step at {time}: "{name}" at {volts[node]:.4g} V '
        f"moves at {moving[node]:.2g} V/s, residual current {rate[node]:.2g} A; the last of "
        f"{error.attempts} attempts, {error.step_s:.1e} s long, {left}",
        time=time,
        surface=name,
        next_step=f'Try: halflit point --material "{surface.material}" --plasma "{plasma}", which '
        "lists its equilibria; a thicker film, a lower resistivity or a bleed resistor often "
        "removes the cause.",
    )


def _largest_step_s(way: Path) -> float:
    if way.trajectory is None:
        return np.inf
    period = revolution_s(way.trajectory, way.case.duration_s)
    step = LARGEST_TURN * period
    if way.case.plasma.changes:
        # 4 degrees where an eccentric orbit turns fastest
        time = np.linspace(0.0, way.case.duration_s, 2001)
        fastest = float(angular_speed_rad_s(way.trajectory, time).max())
        step = LARGEST_TURN_IN_REGIONS * min(period, 8.0 * np.pi / fastest)
    for leg in way.legs:
        if leg.attitude.resolved and leg.attitude.period_s is not None:
            step = min(step, LARGEST_TURN * leg.attitude.period_s)
    return step


@dataclass(frozen=True, slots=True)
class _Frozen:
    """Surroundings that stay as they are at one time."""

    around: Around
    time_s: float

    def at(self, time_s: Array) -> tuple[Setting, Array]:
        return self.around.at(np.full_like(time_s, self.time_s))

    def emitting(self, time_s: Array) -> Array:
        return self.around.emitting(np.full_like(time_s, self.time_s))

    def string_ends_V(self, time_s: Array) -> Array | None:
        return self.around.string_ends_V(np.full_like(time_s, self.time_s))

    def dose_rate_rad_s(self, time_s: Array) -> Array:
        return self.around.dose_rate_rad_s(np.full_like(time_s, self.time_s))


def settled(
    balance: ChargeBalance, start: Array, tolerance: Tolerance = TOLERANCE, time_s: float = 0.0
) -> Array:
    """State [M, n] reached from `start` when the moment `time_s` lasts for ever."""
    still = replace(balance, around=_Frozen(balance.around, time_s))
    reached = march(
        still,
        start,
        span_s=(0.0, SETTLING_S),
        tolerance=tolerance,
        first_step_s=FIRST_STEP_S,
        attempts=SETTLING_ATTEMPTS,
    )
    return np.stack([trajectory.y_end[-1] for trajectory in reached])
