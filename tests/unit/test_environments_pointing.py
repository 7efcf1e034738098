"""Attitude laws, quaternion files and tables of shadows."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.spatial.transform import Rotation, Slerp

from environments.attitude import incidence_cosine, nadir_axes, to_body, tracking_cosine
from environments.attitude_file import read_attitude_csv
from environments.errors import EnvironmentDataError
from environments.orbit import KeplerOrbit
from environments.pointing import (
    Attitude,
    InertialPointing,
    NadirPointing,
    Spin,
    SunPointing,
    YawSteering,
    spin_averaged_cosine,
)
from environments.shadow_table import read_shadow_csv
from environments.trajectory import KeplerTrajectory, geometry
from environments.vectors import direction

EPOCH = np.datetime64("2031-03-20T00:00:00", "ns")
SHOT = geometry(
    KeplerTrajectory(KeplerOrbit(EPOCH, 26560.0, 0.01, 55.0, 40.0)), np.arange(0.0, 50000.0, 500.0)
)
ARGUMENTS = (SHOT.seconds, SHOT.position_m, SHOT.velocity_m_s, SHOT.sun_direction)
LAWS = [
    NadirPointing(), YawSteering(), SunPointing(), SunPointing((1.0, 0.0, 0.0), (0.0, 0.6, 0.8)),
    InertialPointing((0.0, 0.0, 2.0), (1.0, 0.0, 0.5)), Spin((0.3, 0.2, 0.9), 600.0, 20.0),
]  # fmt: skip


@pytest.mark.parametrize("law", LAWS, ids=lambda law: type(law).__name__)
def test_axes_are_orthonormal_and_right_handed(law):
    assert isinstance(law, Attitude)
    axes = law.axes(*ARGUMENTS)
    assert axes.shape == (3, 3, SHOT.seconds.size)
    product = np.einsum("ikn,jkn->ijn", axes, axes)
    np.testing.assert_allclose(product, np.repeat(np.eye(3)[:, :, None], product.shape[2], 2),
                               atol=1e-13)  # fmt: skip
    np.testing.assert_allclose(np.cross(axes[0], axes[1], axis=0), axes[2], atol=1e-13)


def test_nadir():
    np.testing.assert_array_equal(
        NadirPointing().axes(*ARGUMENTS), nadir_axes(SHOT.position_m, SHOT.velocity_m_s)
    )


def test_yaw_steering_faces_the_wings_and_keeps_one_side_dark():
    axes = YawSteering().axes(*ARGUMENTS)
    np.testing.assert_allclose(axes[2], -direction(SHOT.position_m), atol=1e-15)
    sun = to_body(axes, SHOT.sun_direction)
    np.testing.assert_allclose(sun[1], 0.0, atol=1e-13)
    assert (sun[0] > 0.0).all()
    np.testing.assert_allclose(tracking_cosine(sun), 1.0, rtol=1e-13)
    # without it the wings lose cos(beta)
    plain = tracking_cosine(to_body(NadirPointing().axes(*ARGUMENTS), SHOT.sun_direction))
    np.testing.assert_allclose(plain, np.cos(np.radians(SHOT.beta_angle_deg)), atol=1e-3)
    with pytest.raises(ValueError, match="zenith or nadir"):
        YawSteering().axes([0.0], [[7e6], [0], [0]], [[0], [7e3], [0]], [[1.0], [0], [0]])


@pytest.mark.parametrize("law", [LAWS[2], LAWS[3]])
def test_sun_pointing(law):
    axes = law.axes(*ARGUMENTS)
    sun = to_body(axes, SHOT.sun_direction)
    np.testing.assert_allclose(sun, np.array(law.toward_sun)[:, None] + 0.0 * sun, atol=1e-13)
    # no other roll brings the second direction nearer to north
    north = np.einsum("i,ijn->jn", np.array(law.toward_north), axes)[2]
    assert north == pytest.approx(np.sqrt(1.0 - SHOT.sun_direction[2] ** 2), abs=1e-12)


def test_spin_turns_about_its_axis_and_averages_to_the_closed_form():
    law = Spin((0.3, 0.2, 0.9), 600.0, 20.0)
    seconds = np.linspace(0.0, 600.0, 20001)[:-1]
    one = np.ones(seconds.size)
    sun = direction([[0.5], [-0.7], [0.2]])
    axes = law.axes(seconds, np.outer([7e6, 0, 0], one), np.outer([0, 7e3, 0], one), sun)
    np.testing.assert_allclose(axes[2], direction([[0.3], [0.2], [0.9]]) * one, atol=1e-14)
    body = to_body(axes, sun * one)
    faces = np.vstack((np.eye(3), -np.eye(3), [[1, 2, 0.3], [0.2, 0.1, -3.0]]))
    resolved = incidence_cosine(body, faces).mean(axis=1)
    averaged = spin_averaged_cosine(body[:, :1], faces)[:, 0]
    np.testing.assert_allclose(averaged, resolved, atol=1e-6)
    # x moves towards y
    assert axes[0, :, 100] @ axes[1, :, 0] > 0.0
    with pytest.raises(ValueError, match="period_s"):
        Spin((0.0, 0.0, 1.0), 0.0)


@pytest.mark.parametrize("t", [0.0, 0.4, 1.5, np.pi / 2, 3.0, np.pi])
@pytest.mark.parametrize("c", [0.0, 0.7, np.pi / 2, 2.8, np.pi])
def test_spin_average_by_quadrature(t, c):
    sun, face = [[np.sin(t)], [0.0], [np.cos(t)]], [[np.sin(c), 0.0, np.cos(c)]]
    a, b = np.cos(t) * np.cos(c), np.sin(t) * np.sin(c)
    kink = [np.arccos(np.clip(-a / b, -1.0, 1.0))] if b > 1e-12 else None
    expected = quad(lambda p: max(0.0, a + b * np.cos(p)), 0.0, np.pi, points=kink)[0] / np.pi
    assert spin_averaged_cosine(sun, face)[0, 0] == pytest.approx(expected, abs=1e-9)


# --- quaternion files ---------------------------------------------------------------------
NOTES = "# frame = GCRF\n# rotation = body to inertial\n# time_scale = UTC\n"
TURNS = Rotation.from_rotvec(
    np.outer(np.arange(20) * 0.3, direction([[1.0], [2.0], [3.0]]).ravel())
)


def attitude_text(notes=NOTES, quaternions=None):
    q = TURNS.as_quat() if quaternions is None else quaternions
    times = EPOCH + (np.arange(len(q)) * 60).astype("timedelta64[s]")
    rows = [
        f"{str(t)[:19]}Z," + ",".join(f"{x:.9f}" for x in row)
        for t, row in zip(times, q, strict=True)
    ]
    return notes + "time,q_x,q_y,q_z,q_w\n" + "\n".join(rows) + "\n"


@pytest.mark.parametrize("sense", ["body to inertial", "inertial to body"])
def test_quaternions_against_scipy(tmp_path, sense):
    file = tmp_path / "a.csv"
    q = TURNS.as_quat() if sense == "body to inertial" else TURNS.inv().as_quat()
    q[7:] *= -1.0  # the same attitude
    file.write_text(attitude_text(NOTES.replace("body to inertial", sense), q))
    law = read_attitude_csv(file, EPOCH)
    assert isinstance(law, Attitude)
    at = np.linspace(0.0, 1140.0, 333)
    axes = law.axes(at, np.zeros((3, 1)), np.zeros((3, 1)), np.zeros((3, 1)))
    matrices = Slerp(np.arange(20) * 60.0, TURNS)(at).as_matrix()
    for i in range(3):  # body axis i in inertial components
        np.testing.assert_allclose(axes[i].T, matrices[:, :, i], atol=1e-7)
    with pytest.raises(EnvironmentDataError, match="does not cover"):
        law.axes([1141.0], np.zeros((3, 1)), np.zeros((3, 1)), np.zeros((3, 1)))


@pytest.mark.parametrize(
    ("change", "problem", "line"),
    [
        (lambda t: t.replace("# frame = GCRF\n", ""), "frame", None),
        (lambda t: t.replace("GCRF", "ITRF"), "cannot be used", 1),
        (lambda t: t.replace("body to inertial", "maybe"), "cannot be used", 2),
        (lambda t: t.replace("q_w", "q_0"), "columns", 4),
        (lambda t: t.replace("0.000000000,1.0000", "0.000000000,1.0102", 1), "length 1.01", 5),
        (lambda t: t.replace("00:02:00Z", "00:01:00Z"), "repeats", 7),
        (lambda t: t.replace("00:02:00Z", "00:00:30Z"), "goes back", 7),
        (lambda t: t.replace("00:02:00Z", "00:02:00"), "without Z", 7),
        (lambda t: "\n".join(x for x in t.split("\n") if "00:05:00Z" not in x), "gap", 10),
        (lambda t: t[: t.index("00:05:00Z") + 15], "truncated", 10),
        (lambda t: t.replace("0.000000000,1", "nan,1", 1), "not a finite", 5),
        (lambda t: t[: t.index("2031-03-20T00:01")], "fewer than two", 5),
    ],
)
def test_bad_attitude_files(tmp_path, change, problem, line):
    file = tmp_path / "bad.csv"
    file.write_text(change(attitude_text()))
    with pytest.raises(EnvironmentDataError, match=problem) as caught:
        read_attitude_csv(file, EPOCH)
    assert caught.value.file == str(file)
    assert line is None or caught.value.line == line


def test_turns_too_far_between_rows(tmp_path):
    file = tmp_path / "bad.csv"
    q = Rotation.from_rotvec([[0, 0, 0], [0, 0, 0.1], [0, 0, 2.0]]).as_quat()
    file.write_text(attitude_text(quaternions=q))
    with pytest.raises(EnvironmentDataError, match="turns by 109 deg") as caught:
        read_attitude_csv(file, EPOCH)
    assert caught.value.line == 7


# --- tables of shadows ---------------------------------------------------------------------
def shadow_text():
    rows = ["surface,sun_azimuth_deg,sun_elevation_deg,lit_share"]
    for azimuth in range(0, 360, 30):
        for elevation in (-90, -45, 0, 45, 90):
            share = 0.5 + 0.5 * np.cos(np.radians(azimuth)) * np.cos(np.radians(elevation))
            rows.append(f"east panel,{azimuth},{elevation},{share:.9f}")
    return "\n".join(rows) + "\n"


def test_shadow_table(tmp_path):
    file = tmp_path / "s.csv"
    file.write_text(shadow_text())
    table = read_shadow_csv(file, ["east panel"])
    azimuth = np.radians(np.array([0.0, 30.0, 180.0, 345.0, -15.0, 15.0]))
    sun = np.stack((np.cos(azimuth), np.sin(azimuth), 0.0 * azimuth))
    half = 0.5 * (1.0 + 0.5 + 0.5 * np.cos(np.radians(30.0)))
    expected = [1.0, 0.5 + 0.5 * np.cos(np.radians(30.0)), 0.0, half, half, half]
    np.testing.assert_allclose(table.lit_share("east panel", sun), expected, atol=1e-8)
    up = table.lit_share("east panel", [[0.0], [0.0], [1.0]])
    assert up[0] == pytest.approx(0.5)
    with pytest.raises(EnvironmentDataError, match='nearest: "east panel"'):
        table.lit_share("east pannel", sun)


@pytest.mark.parametrize(
    ("change", "problem", "line"),
    [
        (lambda t: t.replace("lit_share", "share"), "columns", 1),
        (lambda t: t.replace("0,-45,", "0,-95,", 1), "outside -90", 3),
        (lambda t: t.replace(",1.000000000", ",1.5", 1), "outside 0 to 1", 4),
        (lambda t: t.replace("0,-45,", "0,-90,", 1), "second time", 3),
        (lambda t: t[: t.index("east panel,330,45")], "grid lacks", 59),
        (lambda t: t.replace("east panel,30,0", "wet panel,30,0"), "is no surface", 9),
        (lambda t: "\n".join(x for x in t.split("\n") if ",90," not in x[12:]), "lacks", None),
    ],
)
def test_bad_shadow_tables(tmp_path, change, problem, line):
    file = tmp_path / "bad.csv"
    file.write_text(change(shadow_text()))
    with pytest.raises(EnvironmentDataError, match=problem) as caught:
        read_shadow_csv(file, ["east panel"])
    assert line is None or caught.value.line == line
