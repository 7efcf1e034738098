"""Files of a case: where they may lie, and everything that can be wrong with a file."""

import hashlib
import os
from pathlib import Path

import pytest

from charging.case import load_case, load_case_text
from charging.case_template import CASE_TEMPLATE
from charging.errors import InputError

PLASMA = """\
title = "Own plasma"
source = "invented for this test"
basis = "assumed"
[[population]]
species = "electron"
density = "1.2 cm-3"
temperature = "12 keV"
[[population]]
species = "H+"
density_m3 = 1.2e6
temperature_eV = 9e3
"""
OWN = CASE_TEMPLATE.replace('"quiet geostationary"', '"data/own.toml"')


def write(folder: Path, text: str = OWN, plasma: str | None = PLASMA) -> Path:
    (folder / "data").mkdir(parents=True, exist_ok=True)
    if plasma is not None:
        (folder / "data" / "own.toml").write_text(plasma, encoding="utf-8")
    path = folder / "case.toml"
    path.write_bytes(text.encode("utf-8"))
    return path


def refused(path: str | Path, *, allow_outside: bool = False) -> InputError:
    with pytest.raises(InputError) as caught:
        load_case(path, allow_outside=allow_outside)
    return caught.value


def test_files_beside_the_case(tmp_path: Path) -> None:
    path = write(tmp_path)
    loaded = load_case(path)
    electrons = loaded.plasmas["data/own.toml"].populations[0]
    assert (electrons.density_m3, electrons.temperature_eV) == (1.2e6, 12e3)
    assert loaded.plasma_texts["data/own.toml"] == PLASMA
    assert loaded.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()
    assert loaded.path == path


@pytest.mark.parametrize("start", ["", "\ufeff"])
def test_text_is_kept_byte_by_byte(tmp_path: Path, start: str) -> None:
    path = write(tmp_path, start + CASE_TEMPLATE.replace("\n", "\r\n"))
    loaded = load_case(str(path))
    assert loaded.text.encode("utf-8") == path.read_bytes()
    assert loaded.sha256 == hashlib.sha256(path.read_bytes()).hexdigest()


def test_a_case_can_be_read_again_from_its_texts_alone(tmp_path: Path) -> None:
    first = load_case(write(tmp_path))
    again = load_case_text(
        first.text, material_texts=first.material_texts, plasma_texts=first.plasma_texts
    )
    assert again.case == first.case
    assert again.sha256 == first.sha256
    assert again.plasmas == first.plasmas
    assert again.material_texts == first.material_texts
    with pytest.raises(InputError, match="text was not kept"):
        load_case_text(first.text)


def test_a_material_file_comes_before_the_library(tmp_path: Path) -> None:
    path = write(tmp_path, CASE_TEMPLATE.replace('"oxidised aluminium"', '"own.toml"'))
    text = load_case_text(CASE_TEMPLATE).material_texts["oxidised aluminium"]
    (tmp_path / "own.toml").write_text(text, encoding="utf-8")
    loaded = load_case(path)
    assert loaded.materials["own.toml"].name == "oxidised aluminium"
    (tmp_path / "own.toml").write_text(text + "\n[colour]\nvalue = 3\n", encoding="utf-8")
    error = refused(path)
    assert error.file is not None
    assert error.file.endswith("own.toml")
    assert error.line == text.count("\n") + 2


@pytest.mark.parametrize(
    ("old", "new", "line", "words"),
    [
        ('density = "1.2 cm-3"', 'density = "1.2 cm3"', 6, "population 1: density"),
        ('density = "1.2 cm-3"', 'density = "1e30 cm-3"', 6, "out of range"),
        ("temperature_eV = 9e3", 'temperature_eV = "9e3"', 11, "population 2: temperature_eV"),
        ("temperature_eV = 9e3", "temperatur_eV = 9e3", 11, 'Nearest: "temperature_eV"'),
        ('species = "H+"', 'species = "H"', 9, "species"),
        ('source = "invented for this test"', "", 0, "source is missing"),
        ('title = "Own plasma"', "title = ", 1, "this is no TOML"),
    ],
)
def test_faults_inside_a_plasma_file(
    tmp_path: Path, old: str, new: str, line: int, words: str
) -> None:
    assert PLASMA.count(old) == 1
    error = refused(write(tmp_path, plasma=PLASMA.replace(old, new)))
    assert error.file == str(tmp_path / "data" / "own.toml")
    assert (error.line or 0) == line
    assert words in str(error)


def test_files_outside_the_folder_need_permission(tmp_path: Path) -> None:
    path = write(tmp_path / "inner", OWN.replace("data/own.toml", "../own.toml"))
    (tmp_path / "own.toml").write_text(PLASMA, encoding="utf-8")
    error = refused(path)
    assert "outside the folder" in str(error)
    assert error.key == ("plasma", "use")
    assert error.line == OWN[: OWN.index("data/own.toml")].count("\n") + 1
    assert load_case(path, allow_outside=True).plasmas["../own.toml"].title == "Own plasma"
    absolute = write(tmp_path / "inner", OWN.replace("data/own.toml", f"{tmp_path}/own.toml"))
    assert "outside the folder" in str(refused(absolute))


def test_links_are_followed_before_the_folder_is_judged(tmp_path: Path) -> None:
    path = write(tmp_path / "inner", plasma=None)
    (tmp_path / "secret.toml").write_text(PLASMA, encoding="utf-8")
    link = tmp_path / "inner" / "data" / "own.toml"
    link.symlink_to(tmp_path / "secret.toml")
    assert "outside the folder" in str(refused(path))
    link.unlink()
    (tmp_path / "inner" / "real.toml").write_text(PLASMA, encoding="utf-8")
    link.symlink_to(tmp_path / "inner" / "real.toml")
    assert "data/own.toml" in load_case(path).plasmas
    link.unlink()
    link.symlink_to(link)  # a ring
    assert isinstance(refused(path), InputError)


def test_a_named_file_that_is_missing_is_reported_in_the_case(tmp_path: Path) -> None:
    error = refused(write(tmp_path, plasma=None))
    assert "is a file that does not exist" in str(error)
    assert error.file == str(tmp_path / "case.toml")


def test_a_named_folder(tmp_path: Path) -> None:
    path = write(tmp_path, plasma=None)
    (tmp_path / "data" / "own.toml").mkdir()
    assert "this is a folder" in str(refused(path))


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"title = 'x'\n\xff\xfe", ":2: byte 0xff is not UTF-8"),
        (b"\x00\x01\x02", "this is no TOML"),
        (b"a = 1\n" * 200_000, "too large"),
        (CASE_TEMPLATE.encode("utf-16"), "is not UTF-8"),
        (b"", "is missing"),
    ],
)
def test_contents_that_are_no_case(tmp_path: Path, content: bytes, words: str) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes(content)
    assert words in str(refused(path))


def test_paths_that_are_no_file(tmp_path: Path) -> None:
    assert "there is no such file" in str(refused(tmp_path / "none.toml"))
    assert "this is a folder" in str(refused(tmp_path))
    assert "cannot be read" in str(refused("a\0b"))
    assert "cannot be read" in str(refused("x" * 5000))
    os.mkfifo(tmp_path / "pipe.toml")
    assert "no ordinary file" in str(refused(tmp_path / "pipe.toml"))


@pytest.mark.skipif(os.geteuid() == 0, reason="root may read everything")
def test_a_file_without_permission(tmp_path: Path) -> None:
    path = write(tmp_path)
    path.chmod(0)
    assert "permission denied" in str(refused(path))
