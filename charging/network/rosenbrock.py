"""Linearly implicit Runge-Kutta (Rosenbrock) methods, L-stable and stiffly accurate.

A step of length h from y solves, stage by stage,

    (M/(γh) - J) u_i = f(t + α_i h, y + Σ a_ij u_j) + M/h Σ c_ij u_j + γ_i h ∂f/∂t

with J = ∂f/∂y at the start; y1 = y + Σ a_sj u_j + u_s, and the last stage is the
estimate of the error (Hairer & Wanner 1996, Solving Ordinary Differential
Equations II, eq. IV.7.25).
"""

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Method:
    """Coefficients of a method with s stages.

    Attributes
    ----------
    name : str
    order : int
        Of the steps; the embedded solution has one less.
    gamma : float
    alpha, gamma_t : tuple of float, [s]
        Stage times and factors of ∂f/∂t, in steps.
    a, c : tuple of tuple of float
        Rows of i numbers for stage i.
    dense_2, dense_3 : tuple of float, [s]
        y(θ) = (1-θ) y0 + θ (y1 + (1-θ) Σ u_i (dense_2_i + θ dense_3_i)).
    """

    name: str
    order: int
    gamma: float
    alpha: tuple[float, ...]
    gamma_t: tuple[float, ...]
    a: tuple[tuple[float, ...], ...]
    c: tuple[tuple[float, ...], ...]
    dense_2: tuple[float, ...]
    dense_3: tuple[float, ...]
    rows: tuple[tuple[Array, Array], ...] = field(init=False, repr=False, compare=False)
    dense: tuple[Array, Array] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        """Keep the rows as arrays that broadcast over stages [i, m, n]."""
        dense = tuple(np.array(row).reshape(-1, 1, 1) for row in (self.dense_2, self.dense_3))
        object.__setattr__(self, "dense", dense)
        rows = tuple(
            (np.array(a).reshape(-1, 1, 1), np.array(c).reshape(-1, 1, 1))
            for a, c in zip(self.a, self.c, strict=True)
        )
        object.__setattr__(self, "rows", rows)

    def evaluates(self, stage: int) -> bool:
        """Whether a stage needs the right-hand side at a new place."""
        return stage == 0 or any(self.a[stage]) or self.alpha[stage] != self.alpha[stage - 1]


RODAS = Method(
    name="RODAS, order 4(3)",
    order=4,
    gamma=0.25,
    alpha=(0.0, 0.386, 0.21, 0.63, 1.0, 1.0),
    gamma_t=(0.25, -0.1043, 0.1035, -0.0362, 0.0, 0.0),
    a=(
        (),
        (1.544,),
        (0.9466785280815826, 0.2557011698983284),
        (3.314825187068521, 2.896124015972201, 0.9986419139977817),
        (1.221224509226641, 6.019134481288629, 12.53708332932087, -0.687886036105895),
        (1.221224509226641, 6.019134481288629, 12.53708332932087, -0.687886036105895, 1.0),
    ),
    c=(
        (),
        (-5.6688,),
        (-2.430093356833875, -0.2063599157091915),
        (-0.1073529058151375, -9.594562251023355, -20.47028614809616),
        (7.496443313967647, -10.24680431464352, -33.99990352819905, 11.7089089320616),
        (
            8.083246795921522,
            -7.981132988064893,
            -31.52159432874371,
            16.31930543123136,
            -6.058818238834054,
        ),
    ),
    dense_2=(
        10.12623508344586,
        -7.487995877610167,
        -34.80091861555747,
        -7.992771707568823,
        1.025137723295662,
        0.0,
    ),
    dense_3=(
        -0.6762803392801253,
        6.087714651680015,
        16.43084320892478,
        24.76722511418386,
        -6.594389125716872,
        0.0,
    ),
)
"""Hairer & Wanner (1996), sec. VI.4, with their dense output of order 3 (from memory, its
orders are tested)."""

RODAS3 = Method(
    name="RODAS3, order 3(2)",
    order=3,
    gamma=0.5,
    alpha=(0.0, 0.0, 1.0, 1.0),
    gamma_t=(0.5, 1.5, 0.0, 0.0),
    a=((), (0.0,), (2.0, 0.0), (2.0, 0.0, 1.0)),
    c=((), (4.0,), (1.0, -1.0), (1.0, -1.0, -8.0 / 3.0)),
    dense_2=(3.0, -1.0, 0.0, 2.0),
    dense_3=(0.0, 0.0, 1.0, 5.0),
)
"""Sandu, Verwer, Blom, Spee, Carmichael & Potra (1997), Atmos. Environ. 31, 3459 (from memory,
its order is tested): four stages, three evaluations. The dense output is ours, of order 2: it
fulfils all conditions up to order 2 and one of the two of order 3, and damps an infinitely stiff
mode as (1-θ)³; no combination of these stages fulfils both."""
