"""Sweeps: the same bits whoever solves them, killed or not; damage is noticed."""

from __future__ import annotations

import errno
import json
import os
import re
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest

from charging.case import load_case
from charging.errors import InputError
from charging.orbit_run import run_case
from charging.study.dataset import by_choice, open_sweep
from charging.study.hands import Processes
from charging.study.plan import Plan, load_study
from charging.study.report import ranking_csv, report_sweep
from charging.study.solve import Block, Results, Solver, blocks
from charging.study.store import Store, manifest_of
from charging.study.sweep import Progress, sweep

CASE = (Path(__file__).parent / "two_films.toml").read_text(encoding="utf-8")
HEAD = """
title = "Coatings"
case = "case.toml"
seed = 7
members = 6
"""
STUDY = (
    HEAD
    + """
draw = "spreads"
replicates = 3
[[vary]]
path = "surface.tag.material"
values = ["PTFE", "ITO coating"]
[[vary]]
path = "material.polyimide film.bulk_resistivity_ohm_m"
low = 1e14
high = 1e18
law = "log_uniform"
"""
)
SIZE = 4


def written(folder: Path, study: str, case: str = CASE) -> Path:
    (folder / "case.toml").write_text(case, encoding="utf-8")
    path = folder / "study.toml"
    path.write_text(study, encoding="utf-8")
    return path


def plan(folder: Path, study: str, case: str = CASE) -> Plan:
    return load_study(written(folder, study, case))


def same(a: list[Results], b: list[Results]) -> bool:
    return all(
        x.keys() == y.keys() and all(np.array_equal(x[k], y[k], equal_nan=True) for k in x)
        for x, y in zip(a, b, strict=True)
    )


@pytest.fixture(scope="module")
def serial(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, list[Results]]:
    folder = tmp_path_factory.mktemp("serial")
    study = plan(folder, STUDY)
    store = sweep(study, folder / "out", block_size=SIZE)
    return folder, by_choice(study, store)


def test_block_size_changes_no_bit(serial: tuple[Path, list[Results]], tmp_path: Path) -> None:
    study = plan(tmp_path, STUDY)
    told: list[Progress] = []
    store = sweep(study, tmp_path / "out", block_size=3, tell=told.append)
    assert same(by_choice(study, store), serial[1])
    assert [p.done for p in told] == [3, 6, 9, 12]
    assert told[-1].left_s == 0.0


def test_two_processes_change_no_bit(serial: tuple[Path, list[Results]], tmp_path: Path) -> None:
    study = plan(tmp_path, STUDY)
    store = sweep(study, tmp_path / "out", block_size=SIZE, hands=Processes(study, 2))
    assert same(by_choice(study, store), serial[1])


def test_a_member_is_the_case_with_its_values(tmp_path: Path) -> None:
    """The worst values of a study without draws against a run of the same case."""
    study = plan(tmp_path, HEAD)
    found = Solver(study).solve(blocks(study, SIZE)[0])
    run = run_case(load_case(tmp_path / "case.toml")).modes[0]
    v = run.trajectories[0](run.times_s)
    for surface, node in enumerate(run.net.surface_node[1:], 1):
        exact = v[:, node].min()
        assert found["lowest_V"][0, 0, 0, surface] == pytest.approx(exact, rel=0.01, abs=1.0)
    assert found["lowest_V"][0, 0, 0, 0] == 0.0


def test_resume_goes_on_and_refuses_what_differs(
    serial: tuple[Path, list[Results]], tmp_path: Path
) -> None:
    study = plan(tmp_path, STUDY)
    out = tmp_path / "out"

    class Enough(Exception):  # noqa: N818 - ends the sweep after a block
        pass

    def stop(progress: Progress) -> None:
        raise Enough

    with pytest.raises(Enough):
        sweep(study, out, block_size=SIZE, tell=stop)
    kept = sorted(p.name for p in (out / "blocks").iterdir())
    assert len(kept) == 1
    with pytest.raises(InputError, match="holds a study already"):
        sweep(study, out, block_size=SIZE)
    (out / "blocks" / "000009-abc.part").write_bytes(b"left by a killed run")
    store = sweep(study, out, block_size=SIZE, resume=True)
    assert kept[0] in names(out)  # not computed again
    assert len(names(out)) == len(blocks(study, SIZE))
    assert same(by_choice(study, store), serial[1])
    # one changed value of a material
    record = tmp_path / "film.toml"
    from materials.library import library_text

    record.write_text(library_text("PTFE"), encoding="utf-8")
    other = STUDY.replace(
        'values = ["PTFE", "ITO coating"]', 'values = ["film.toml", "ITO coating"]'
    )
    changed = plan(tmp_path, other)
    with pytest.raises(InputError, match="study_sha256"):
        sweep(changed, out, block_size=SIZE, resume=True)
    with pytest.raises(InputError, match="blocks"):
        sweep(study, out, block_size=SIZE + 1, resume=True)


def test_a_changed_material_value_is_noticed(tmp_path: Path) -> None:
    from materials.library import library_text

    text = library_text("PTFE")
    case = CASE.replace('"PTFE"', '"film.toml"')
    (tmp_path / "film.toml").write_text(text, encoding="utf-8")
    small = HEAD.replace("members = 6", "members = 1")
    study = plan(tmp_path, small, case)
    sweep(study, tmp_path / "out")
    other, count = re.subn(r"(\[relative_permittivity\]\s+value\s*=\s*)\S+", r"\g<1>2.05", text)
    assert count == 1
    (tmp_path / "film.toml").write_text(other, encoding="utf-8")
    with pytest.raises(InputError, match="materials_sha256"):
        sweep(plan(tmp_path, small, case), tmp_path / "out", resume=True)


def test_one_changed_byte_is_noticed(tmp_path: Path) -> None:
    study = plan(tmp_path, HEAD)
    store = sweep(study, tmp_path / "out")
    block = next((tmp_path / "out" / "blocks").iterdir())
    content = bytearray(block.read_bytes())
    content[len(content) // 2] ^= 1
    block.write_bytes(content)
    with pytest.raises(InputError, match="damaged"):
        by_choice(study, store)
    with pytest.raises(InputError, match="damaged"):
        sweep(study, tmp_path / "out", resume=True)


def test_two_runs_into_one_folder(tmp_path: Path) -> None:
    study = plan(tmp_path, HEAD)
    store = Store(tmp_path / "out", manifest_of(study, blocks(study, SIZE)))
    other = Store(tmp_path / "out", manifest_of(study, blocks(study, SIZE)))
    with (
        store.opened(resume=False),
        pytest.raises(InputError, match="in use"),
        other.opened(resume=True),
    ):
        pass
    with other.opened(resume=True):  # free again
        pass


def test_a_foreign_folder_is_left_alone(tmp_path: Path) -> None:
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "thesis.txt").write_text("years of work", encoding="utf-8")
    with pytest.raises(InputError, match=r"thesis\.txt"):
        sweep(plan(tmp_path, HEAD), tmp_path / "out")
    assert sorted(p.name for p in (tmp_path / "out").iterdir()) == ["lock", "thesis.txt"]


def test_report_of_a_sweep(serial: tuple[Path, list[Results]]) -> None:
    folder, _ = serial
    study = plan(folder, STUDY)
    store = Store(folder / "out", manifest_of(study, blocks(study, SIZE)))
    report = report_sweep(study, store)
    document = json.loads((folder / "out" / "ranking.json").read_text(encoding="utf-8"))
    assert document["members"] == 12
    assert document["failed"] == 0
    assert document["seed"] == 7
    assert "conditional on assumed spreads" in document["conditional_on"]
    for row in document["rows"]:
        low, high = row["interval"]
        assert 0.0 <= low <= row["exceed_probability"] <= high <= 1.0
        if row["exceed_probability"] == 0.0:
            assert high >= 3.0 / 6.0  # never probability 0
    with open_sweep(folder / "out") as kept:
        assert kept.sizes["member"] == 12
        assert kept["surface_name"].values.tolist() == ["hull", "blanket no. 1.5", "tag"]
        drawn = kept["material_polyimide_film_bulk_resistivity_ohm_m"].values
        assert drawn.min() >= 1e14
        assert drawn.max() <= 1e18
        coating = kept["surface_tag_material"].values.tolist()
        assert coating == 6 * ["PTFE"] + 6 * ["ITO coating"]
        lowest = kept.set_xindex("surface_name")["lowest_V"].sel(surface_name="tag")
        assert float(lowest[6:].min()) == 0.0
    assert ranking_csv(report.rows).splitlines()[0].startswith("rank,choice,worst_V")
    assert (folder / "out" / "heat_map.png").read_bytes()[:4] == b"\x89PNG"
    # six draws tell no driver among so many factors
    assert [row["driver"] for row in document["rows"]] == [None, None]


SWEEP = """
import sys
from pathlib import Path
from charging.study.plan import load_study
from charging.study.sweep import sweep
out = Path(sys.argv[2])
sweep(load_study(sys.argv[1]), out, block_size=2, resume=(out / "manifest.json").exists())
"""
# dies like a process that loses its power after a block is written and before it has its name
DIES_BEFORE_RENAMING = """
import os, signal
from pathlib import Path
true_replace = Path.replace
def replace(self, target):
    if Path(target).name.startswith("000002-"):
        os.kill(os.getpid(), signal.SIGKILL)
    return true_replace(self, target)
Path.replace = replace
"""


def started(script: str, study: Path, out: Path) -> subprocess.Popen[bytes]:
    env = dict(os.environ, OMP_NUM_THREADS="1")
    return subprocess.Popen([sys.executable, "-c", script, str(study), str(out)], env=env)


def names(out: Path) -> set[str]:
    return {p.name for p in (out / "blocks").glob("*.npz")} if out.exists() else set()


def test_killed_between_writing_and_renaming(
    serial: tuple[Path, list[Results]], tmp_path: Path
) -> None:
    """kill -9 between the write and the rename, then resume: nothing lost, nothing doubled."""
    path, out = written(tmp_path, STUDY), tmp_path / "out"
    process = started(DIES_BEFORE_RENAMING + SWEEP, path, out)
    assert process.wait(timeout=100) == -signal.SIGKILL
    before = names(out)
    assert len(before) == 2
    assert len(list((out / "blocks").glob("*.part"))) == 1  # the block that had no name yet
    study = load_study(path)
    store = sweep(study, out, block_size=2, resume=True)
    assert before <= names(out)
    assert len(names(out)) == 6
    assert list((out / "blocks").glob("*.part")) == []
    assert same(by_choice(study, store), serial[1])


@pytest.mark.slow
@pytest.mark.timeout(900)
def test_twenty_random_kills_lose_no_finished_block(tmp_path: Path) -> None:
    """kill -9 at 20 random moments, each followed by a resume, against an undisturbed run."""
    text = STUDY.replace("members = 6", "members = 48")
    path, out = written(tmp_path, text), tmp_path / "out"
    study = load_study(path)
    whole = sweep(study, tmp_path / "whole", block_size=2)
    rng = np.random.default_rng(20310320)
    before: set[str] = set()
    kills = 0
    while kills < 20:
        process = started(SWEEP, path, out)
        wait = time.monotonic() + 100.0
        # half of the kills fall anywhere, also before the first block and while files load
        if rng.random() < 0.5:
            while names(out) == before and process.poll() is None and time.monotonic() < wait:
                time.sleep(0.005)
        time.sleep(float(rng.uniform(0.0, 0.6)))
        ended = process.poll()
        if ended is not None:
            assert ended == 0
            break
        process.send_signal(signal.SIGKILL)
        process.wait()
        kills += 1
        now = names(out)
        assert before <= now  # nothing finished is lost
        before = now
    assert kills == 20
    store = sweep(study, out, block_size=2, resume=True)
    assert before <= names(out)
    assert names(out) == names(tmp_path / "whole")  # names hold the hashes: same bits, no doubles
    assert same(by_choice(study, store), by_choice(study, whole))


def test_a_full_disk_and_a_read_only_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    study = plan(tmp_path, HEAD)
    store = Store(tmp_path / "out", manifest_of(study, blocks(study, SIZE)))
    with store.opened(resume=False):

        def full(descriptor: int) -> None:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

        monkeypatch.setattr(os, "fsync", full)
        with pytest.raises(InputError, match="no space left"):
            store.write(blocks(study, SIZE)[0], {"final_V": np.zeros(1)})
        monkeypatch.undo()
    assert list((tmp_path / "out" / "blocks").iterdir()) == []
    monkeypatch.setattr(Path, "mkdir", _refused)
    with pytest.raises(InputError, match="permission denied"):
        sweep(study, tmp_path / "other")


def _refused(path: Path, *args: object, **options: object) -> None:
    raise PermissionError(errno.EACCES, os.strerror(errno.EACCES))


def test_ctrl_c_keeps_blocks_and_says_how_to_go_on(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    from charging.cli import main
    from charging.study import sweep as module

    path = written(tmp_path, STUDY)
    true_write, kept = Store.write, []

    def write(self: Store, block: Block, results: Results) -> None:
        if len(kept) == 1:
            raise KeyboardInterrupt
        true_write(self, block, results)
        kept.append(block)

    monkeypatch.setattr(Store, "write", write)
    monkeypatch.setattr(module, "BLOCK", 4)
    arguments = ["halflit", "sweep", str(path), "--out", str(tmp_path / "out")]
    monkeypatch.setattr(sys, "argv", arguments)
    with pytest.raises(SystemExit) as left:
        main()
    assert left.value.code == 130
    assert "--resume" in capsys.readouterr().err
    assert len(names(tmp_path / "out")) == 1
    monkeypatch.undo()
    monkeypatch.setattr(module, "BLOCK", 4)
    monkeypatch.setattr(sys, "argv", [*arguments, "--resume"])
    with pytest.raises(SystemExit) as left:
        main()
    assert left.value.code == 0
    assert "conditional on assumed spreads" in capsys.readouterr().out
