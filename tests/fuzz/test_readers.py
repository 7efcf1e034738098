"""Bent files of every kind: read, or refused in one readable line; `campaign.py` runs long."""

from __future__ import annotations

import json
import random
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE))  # the modules beside this one, which the campaign uses too

from reader_mutations import bent, bent_lines  # noqa: E402
from reader_seeds import (  # noqa: E402  # noqa: E402
    ACTIVITY,
    ATTITUDE,
    FIXED,
    SHADOW,
    STUDY,
    TABLE,
    TABULATED,
    circle_rows,
    ephemeris_csv,
    oem,
    seeds,
)
from readers_under_test import GATES, readers, refused, watched  # noqa: E402

KINDS = tuple(GATES)
SEEDS = seeds()
SLOW_KINDS = {"case": 20, "study": 8, "material": 20}

Reader = Callable[[bytes], object]


@pytest.fixture(scope="module")
def read(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Reader]:
    return readers(tmp_path_factory.mktemp("fuzz"), FIXED)


@pytest.mark.parametrize("kind", KINDS)
def test_the_files_that_are_bent_are_good(read: dict[str, Reader], kind: str) -> None:
    assert SEEDS[kind]
    for text in SEEDS[kind]:
        with watched(kind) as gate:
            read[kind](text.encode())
        assert gate.passed


@pytest.mark.parametrize("kind", KINDS)
def test_bent_files_are_read_or_refused(read: dict[str, Reader], kind: str) -> None:
    @settings(
        max_examples=SLOW_KINDS.get(kind, 60),
        deadline=None,
        suppress_health_check=list(HealthCheck),
        database=None,
    )
    @given(st.randoms(use_true_random=False), st.sampled_from(SEEDS[kind]))
    def bend(draw: random.Random, text: str) -> None:
        refused(read[kind], bent(kind, text, draw).encode("utf-8", errors="surrogatepass"))

    bend()


def test_most_bent_files_get_past_the_grammar(read: dict[str, Reader]) -> None:
    draw, past, count = random.Random(5), 0, 0
    for kind in ("oem", "tle", "activity", "temperature", "shadow", "ephemeris table"):
        with watched(kind) as gate:
            for _ in range(40):
                gate.passed = False
                refused(read[kind], bent(kind, draw.choice(SEEDS[kind]), draw).encode())
                past += gate.passed
                count += 1
    assert past > count / 2


@settings(max_examples=100, deadline=None, suppress_health_check=list(HealthCheck))
@given(st.binary(max_size=300), st.sampled_from(KINDS))
def test_bytes_without_meaning_are_refused(
    read: dict[str, Reader], content: bytes, kind: str
) -> None:
    assert refused(read[kind], content)


# --- what the campaigns found ---------------------------------------------------------------------

FAR = ephemeris_csv().replace("42164.170000000", "1e300", 1)
FINDS = {
    # refusals that showed a terminal what it would have obeyed
    "control character in a column of a table": (
        "ephemeris table",
        TABLE.replace("x_km", "\x1b[2J"),
    ),
    "control character in a cell": ("activity", ACTIVITY.replace("2.333", "\x00")),
    "control character in a column of the activity": ("activity", ACTIVITY.replace("kp", "\x9b1m")),
    "control character in a note": ("attitude", ATTITUDE.replace("inertial", "inertia\xa0l")),
    "control character in a column of the shadow": ("shadow", SHADOW.replace("share", "sha\x87re")),
    "control character in a version": ("oem", oem().replace("2.0", "2\x8e.0", 1)),
    "control character in a key of a material": (
        "material",
        SEEDS["material"][0].replace("kind =", '"ki\x85nd" =', 1),
    ),
    "control character in a key of a plasma": (
        "plasma",
        TABULATED.replace("kappa =", '"\u202e" ='),
    ),
    "control character in a path of a study": (
        "study",
        STUDY.replace("surface.film.thickness_m", "\\u0007"),
    ),
    # squares that overflowed, with a warning in the terminal
    "place beyond all numbers": ("ephemeris table", FAR),
    "state beyond all numbers": ("oem", oem().replace(f"{circle_rows()[3][1][0]:.9f}", "1e306")),
}


@pytest.mark.parametrize("name", FINDS)
def test_finds_are_refused(read: dict[str, Reader], name: str) -> None:
    kind, text = FINDS[name]
    assert refused(read[kind], text.encode())


def test_bending_changes_a_text() -> None:
    draw = random.Random(1)
    assert sum(bent("oem", oem(), draw) != oem() for _ in range(50)) > 40
    assert sum(bent_lines(FIXED, draw) != FIXED for _ in range(50)) > 40


@pytest.mark.slow
@pytest.mark.timeout(1800)
def test_a_campaign_finds_nothing(tmp_path: Path) -> None:
    record = tmp_path / "record.json"
    subprocess.run(
        [sys.executable, str(HERE / "campaign.py"), "--inputs", "60000", "--random", "--seed", "2",
         "--record", str(record), "--finds", str(tmp_path / "finds")],
        check=True,
    )  # fmt: skip
    total = json.loads(record.read_text(encoding="utf-8"))["total"]
    assert total["inputs"] >= 60000
    assert total["past_grammar"] > total["inputs"] / 2


@pytest.mark.slow
@pytest.mark.timeout(1800)
def test_a_campaign_led_by_coverage_finds_nothing(tmp_path: Path) -> None:
    pytest.importorskip("atheris")
    record = tmp_path / "record.json"
    subprocess.run(
        [sys.executable, str(HERE / "campaign.py"), "--inputs", "20000", "--seed", "2",
         "--record", str(record), "--finds", str(tmp_path / "finds")],
        check=True,
    )  # fmt: skip
    assert json.loads(record.read_text(encoding="utf-8"))["total"]["inputs"] >= 20000


def test_random_physical_cases_close(capsys: pytest.CaptureFixture[str]) -> None:
    from physical_cases import run

    record = run(6, seed=3, members=3)
    assert record["cases"] == 6
    assert record["faults"] == []


@pytest.mark.slow
@pytest.mark.timeout(1800)
def test_many_random_physical_cases_close() -> None:
    from physical_cases import run

    record = run(1000, seed=4)
    # one case in two thousand closes charge to a few 1e-4 only, for want of tolerance
    told = [one["fault"] for one in record["faults"]]
    assert all(text.startswith("charge open by ") for text in told), told
    assert all(float(text.split()[3]) < 1e-3 for text in told), told
    assert len(told) < 5
    assert record["against the balance"] > 300
    assert record["under way"] + record["beyond 200 kV, refused"] < 50
