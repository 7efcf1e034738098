r"""Forward sensitivities: how potentials along a run answer to its parameters.

Charge is what moves: with :math:`M(p)\,y` for the charges of the state variables the
march solves :math:`\mathrm{d}(My)/\mathrm{d}t = f(t, y, p)`. Its derivative by p,

.. math:: \frac{\mathrm{d}}{\mathrm{d}t}(M s + M_p y) = J s + f_p,
          \qquad s = \partial y/\partial p,

is linear. It is solved along the stored trajectory, on its own steps, with the
two-stage Radau IIA method (order 3, L-stable; Hairer & Wanner 1996, Solving Ordinary
Differential Equations II, table IV.5.5). J is the march's own Jacobian; :math:`M_p` and
:math:`f_p` are central differences between two neighbouring spacecraft at the same state.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from charging.case import LoadedCase
from charging.members import Member, block_balance
from charging.network.charge_balance import ChargeBalance
from charging.network.march import Trajectory
from charging.orbit_run import ModeRun
from environments.plasma import Plasma
from materials.record import Material

Array = NDArray[np.float64]

STEP = 1e-3
"""Half-width of the central differences by the logarithm of a parameter."""

NODES = (1.0 / 3.0, 1.0)
RADAU_IIA = np.array([[5.0 / 12.0, -1.0 / 12.0], [3.0 / 4.0, 1.0 / 4.0]])


@dataclass(frozen=True, slots=True)
class Parameter:
    """A positive number of a spacecraft or its surroundings that may be scaled.

    Attributes
    ----------
    name : str
    scaled : callable
        Gives the member with the number multiplied by a factor.
    """

    name: str
    scaled: Callable[[Member, float], Member]


def material_value(material: str, key: str) -> Parameter:
    """A property of a material, named as the case names it; key as in the material's record."""

    def scaled(member: Member, factor: float) -> Member:
        own = member.materials[material]
        value = replace(own.values[key], value=factor * own.value(key))
        return _with_material(member, material, replace(own, values={**own.values, key: value}))

    return Parameter(f"{material}: {key}", scaled)


def photo_level(material: str) -> Parameter:
    """Level of the photoyield curve of a material's record."""

    def scaled(member: Member, factor: float) -> Member:
        own = member.materials[material]
        if own.photoyield is None:
            raise ValueError(f'material "{material}" has no photoyield')
        curve = replace(own.photoyield, level_factor=factor * own.photoyield.level_factor)
        return _with_material(member, material, replace(own, photoyield=curve))

    return Parameter(f"{material}: photoyield level", scaled)


def film_thickness(surface: str) -> Parameter:
    """Thickness of a dielectric surface."""

    def scaled(member: Member, factor: float) -> Member:
        rows = []
        for row in member.case.surface:
            if row.name == surface:
                if row.thickness_m is None:
                    raise ValueError(f'surface "{surface}" has no thickness_m')
                row = row.model_copy(update={"thickness_m": factor * row.thickness_m})
            rows.append(row)
        return replace(member, case=member.case.model_copy(update={"surface": tuple(rows)}))

    return Parameter(f"{surface}: thickness_m", scaled)


def plasma_density(plasma: str, *, electrons: bool) -> Parameter:
    """Density of all electrons, or of all ions, of a plasma with Maxwellian populations."""

    def scaled(member: Member, factor: float) -> Member:
        own: Plasma = member.plasmas[plasma]
        rows = []
        for row in own.populations:
            if (row.species.charge_number < 0) == electrons:
                if row.distribution is not None:
                    raise ValueError(f'plasma "{plasma}" has a {row.law} population')
                row = replace(row, density_m3=factor * row.density_m3)
            rows.append(row)
        changed = replace(own, populations=tuple(rows))
        return replace(member, plasmas={**member.plasmas, plasma: changed})

    return Parameter(f"{plasma}: {'electron' if electrons else 'ion'} density", scaled)


def _with_material(member: Member, name: str, material: Material) -> Member:
    return replace(member, materials={**member.materials, name: material})


@dataclass(frozen=True, slots=True)
class Sensitivities:
    """Derivatives of the state variables by the logarithms of P parameters.

    Attributes
    ----------
    names : tuple of str
    path : Trajectory
        What they belong to.
    start, middle, end : ndarray [K, P, n]
        At the start, a third and the end of every step; quadratic between.
    balance : ChargeBalance
    """

    names: tuple[str, ...]
    path: Trajectory
    start: Array
    middle: Array
    end: Array
    balance: ChargeBalance

    def __call__(self, time_s: Array) -> Array:
        """Derivatives [T, P, n] of the state variables [V] at times [T]."""
        path = self.path
        k = np.searchsorted(path.start_s, time_s, side="right") - 1
        k = np.clip(k, 0, len(path.start_s) - 1)
        x = ((time_s - path.start_s[k]) / path.step_s[k])[:, None, None]
        # Lagrange polynomials of 0, 1/3, 1
        found: Array = (
            (1.0 - 3.0 * x) * (1.0 - x) * self.start[k]
            + 4.5 * x * (1.0 - x) * self.middle[k]
            + 0.5 * x * (3.0 * x - 1.0) * self.end[k]
        )
        return found

    def potentials(self, time_s: Array) -> Array:
        """Derivatives [T, P, n] of the absolute node potentials [V] at times [T]."""
        return self.balance.net.potentials(self(time_s))


def sensitivities(
    loaded: LoadedCase, run: ModeRun, parameters: Sequence[Parameter], member: int = 0
) -> Sensitivities:
    """Derivatives of all potentials by the logarithms of parameters, along one member's run.

    Parameters
    ----------
    loaded : LoadedCase
    run : ModeRun
        From `solve_mode`.
    parameters : sequence of Parameter
    member : int

    Returns
    -------
    Sensitivities
        dφ/d ln p [V]: what a change of p by one per cent moves, times 100.

    Raises
    ------
    ValueError
        A parameter does not belong to this member.

    Notes
    -----
    A jump between branches is an amplifier: after it the derivatives hold for changes so
    small that the jump moves by less than the march's steps there.
    """
    balance, path = run.balance, run.trajectories[member]
    own = run.members[member]
    pairs = [[p.scaled(own, 1.0 + sign * STEP) for p in parameters] for sign in (-1.0, 1.0)]
    neighbours = [*pairs[0], *pairs[1]]
    mode = next((m for m in loaded.case.alternatives if m.name == run.name), None)
    beside = block_balance(neighbours, [run.spectrum] * len(neighbours), mode, run.around)

    steps, n = path.y_start.shape
    count = len(parameters)
    ends = np.append(path.start_s[1:], path.start_s[-1] + path.step_s[-1])
    # what holds before a break holds up to it
    times = np.stack(
        [path.start_s + NODES[0] * path.step_s, np.nextafter(ends, -np.inf)], axis=1
    ).ravel()
    states = path.inside(np.repeat(np.arange(steps), 2), np.tile(NODES, steps))
    which = np.full(2 * steps, member)
    jacobian = balance.rhs_and_jacobian(which, times, states)[1].reshape(steps, 2, n, n)
    mass = balance.mass if balance.mass.ndim == 2 else balance.mass[member]
    by_state = np.empty((steps, 2, count, n))  # f_p
    charge = np.empty((steps, 2, count, n))  # M_p y
    first = np.empty((count, n))  # M_p y at the start
    span = 2.0 * STEP
    for p in range(count):
        low, high = (beside.rhs(np.full(2 * steps, q), times, states) for q in (p, count + p))
        by_state[:, :, p] = ((high - low) / span).reshape(steps, 2, n)
        if beside.mass.ndim == 3:
            mass_p = (beside.mass[count + p] - beside.mass[p]) / span
        else:
            mass_p = np.zeros((n, n))
        charge[:, :, p] = (states @ mass_p.T).reshape(steps, 2, n)
        first[p] = mass_p @ path.y_start[0]

    h = path.step_s[:, None, None, None, None]
    matrix = -h * RADAU_IIA[:, :, None, None] * jacobian[:, None]  # [K, i, j, n, n]
    matrix[:, (0, 1), (0, 1)] += mass
    matrix = np.swapaxes(matrix, 2, 3).reshape(steps, 2 * n, 2 * n)
    driven = (
        path.step_s[:, None, None, None] * np.einsum("ij,kjpn->kipn", RADAU_IIA, by_state) - charge
    )
    known = np.empty((steps, 2 * n, n + count))
    known[:, :, :n] = np.tile(np.eye(n), (2, 1))  # by the charge at the start of the step
    known[:, :, n:] = np.swapaxes(driven, 2, 3).reshape(steps, 2 * n, count)
    # without scaling a step of a microsecond beside one of an hour loses digits
    scale = np.abs(matrix).max(axis=-1, keepdims=True)
    answer = np.linalg.solve(matrix / scale, known / scale)
    start, middle, end = np.empty((3, steps, count, n))
    s = _at_start(loaded, run, jacobian[0, 0], by_state[0, 0])
    at = s @ mass.T + first
    for k in range(steps):
        start[k] = s
        both = answer[k, :, :n] @ at.T + answer[k, :, n:]
        middle[k], end[k] = both[:n].T, both[n:].T
        s = end[k]
        at = s @ mass.T + charge[k, 1]
    return Sensitivities(tuple(p.name for p in parameters), path, start, middle, end, balance)


def _at_start(loaded: LoadedCase, run: ModeRun, jacobian: Array, by_state: Array) -> Array:
    """Derivatives [P, n] of the starting state: none of an uncharged one."""
    if loaded.case.time.start == "uncharged":
        return np.zeros_like(by_state)
    return np.asarray(np.linalg.solve(jacobian, -by_state.T).T)
