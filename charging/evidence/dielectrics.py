"""Conduction and the network against closed forms."""

from __future__ import annotations

from collections.abc import Iterator
from functools import partial

import numpy as np
from scipy.constants import epsilon_0

from charging.evidence.check import Check
from charging.network.nodes import Face, network
from materials.conduction import (
    adamec_calderwood_1981_factor,
    arrhenius_conductivity,
    arrhenius_kernel,
    enhancement_factor_kernel,
)

ARRHENIUS = "exp[-(E/k)(1/T - 1/T0)] by hand, E = 1 eV, T0 = 298.15 K"
FIELD = (
    "[2 + cosh(beta F^(1/2)/2kT)]/3 sinh(y)/y with another program, Adamec & Calderwood 1981, "
    "J. Phys. D 14, 1487"
)


def _relative_conductivity(temperature_K: float) -> float:
    return float(
        arrhenius_conductivity(temperature_K, resistivity_ohm_m=1.0, activation_energy_eV=1.0)
    )


def dielectric_checks() -> Iterator[Check]:
    """Rows about films: their conduction and capacitance."""
    for temperature, value in ((273.15, 0.02837335), (223.15, 2.083475e-6), (333.15, 59.6821)):
        yield Check(
            f"conductivity at {temperature:g} K over 298.15 K", "conduction, Arrhenius", value,
            "1", 1e-4, ARRHENIUS, "closed form",
            partial(_relative_conductivity, temperature),
        )  # fmt: skip
    for field, permittivity, temperature, value in (
        (1e7, 3.4, 298.15, 2.795933),
        (1e8, 3.4, 298.15, 885.3703),
        (3e7, 2.1, 298.15, 47.54853),
        (1e8, 3.4, 223.15, 19077.85),
    ):
        yield Check(
            f"factor of {field:g} V/m on conduction, permittivity {permittivity:g}, "
            f"{temperature:g} K",
            "conduction, field enhancement", value, "1", 1e-5, FIELD, "closed form",
            partial(adamec_calderwood_1981_factor, field, temperature, permittivity),
        )  # fmt: skip
    # the kernels of a march, apart from the functions above
    yield Check(
        "conductivity at 243.15 K over 298.15 K in a march", "conduction, Arrhenius", 1.501293e-4,
        "1", 1e-4, ARRHENIUS, "closed form",
        lambda: float(arrhenius_kernel(np.array(243.15), np.array(1.0))),
    )  # fmt: skip
    yield Check(
        "factor of 3e+07 V/m on conduction in a march, permittivity 3.4, 298.15 K",
        "conduction, field enhancement", 14.884611, "1", 1e-5, FIELD, "closed form",
        lambda: float(
            enhancement_factor_kernel(np.array(3e7), np.array(298.15), np.array(3.4))
        ),
    )  # fmt: skip
    film = Face("film", "structure", 2.0, thickness_m=127e-6, relative_permittivity=2.1)
    net = network([film], [], 1.0)
    yield Check(
        "capacitance of 2 m2 of film, 127 um, permittivity 2.1", "capacitance of a film",
        epsilon_0 * 2.1 * 2.0 / 127e-6, "F", 1e-12, "eps0 eps_r A/d by hand", "closed form",
        lambda: float(-net.capacitance_F[0, 1]),
    )  # fmt: skip
    yield Check(
        "capacitance of a body of 1 m radius", "capacitance of the body", 1.112650e-10, "F", 1e-6,
        "4 pi eps0 R by hand", "closed form",
        lambda: float(np.asarray(net.capacitance_F).sum()),
    )  # fmt: skip
