"""A substorm that a case gives to the plasma of the regions."""

from __future__ import annotations

import numpy as np
import pytest

from charging.case import load_case_text
from charging.case_files import CaseFiles
from charging.errors import InputError
from charging.plasma_sources import activity_of

CASE = """
title = "substorm of the regions"
[orbit]
kind = "kepler"
epoch = 2031-03-20T00:00:00Z
semi_major_axis_km = 42164.17
eccentricity = 0.0
inclination_deg = 0.0
raan_deg = 0.0
argument_of_perigee_deg = 0.0
mean_anomaly_deg = 0.0
[time]
duration_h = 24.0
[attitude]
law = "nadir"
[plasma]
model = "regions"
kp = 3.0
[[plasma.substorm]]
onset_h = 11.5
electron_temperature = "15 keV"
[[plasma.substorm]]
onset = 2031-03-20T14:00:00Z
hold_min = 20
ion_density = "0.4 cm-3"
[body]
radius_m = 1.6
[[surface]]
name = "body"
material = "ITO coating"
area_m2 = 3.2
normal = [1.0, 0.0, 0.0]
attached_to = "structure"
"""


def test_keys_reach_the_activity() -> None:
    first, second = activity_of(load_case_text(CASE).case, None, CaseFiles()).substorms
    assert first.onset == np.datetime64("2031-03-20T11:30")
    assert (first.electron_temperature_eV, first.hold_min) == (15e3, 40.0)
    assert second.onset == np.datetime64("2031-03-20T14:00")
    assert second.ion_density_m3 == pytest.approx(0.4e6)


@pytest.mark.parametrize(
    ("old", "new", "word"),
    [
        ("onset_h = 11.5\n", "", "onset"),
        ('model = "regions"\nkp = 3.0\n', 'use = "quiet geostationary"\n', "regions"),
        ("hold_min = 20", "hold_mins = 20", "hold_min"),
        ("hold_min = 20", "hold_min = -20", "hold_min"),
    ],
)
def test_refused(old: str, new: str, word: str) -> None:
    text = CASE.replace(old, new)
    assert text != CASE
    with pytest.raises(InputError, match=word):
        load_case_text(text)
