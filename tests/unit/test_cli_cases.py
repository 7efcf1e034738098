"""`halflit case`: a start, a check, the schema."""

import json
import sys
import tomllib

import pytest

from charging import cli
from charging.case_template import CASE_TEMPLATE


@pytest.fixture
def case(monkeypatch, capsys):
    """Run ``halflit case`` in this process; return exit code, stdout, stderr."""

    def run(*arguments):
        monkeypatch.setattr(sys, "argv", ["halflit", "case", *map(str, arguments)])
        with pytest.raises(SystemExit) as caught:
            cli.main()
        out, err = capsys.readouterr()
        return caught.value.code or 0, out, err

    return run


def test_new_prints_a_case_that_passes_its_own_check(case, tmp_path):
    code, out, err = case("new")
    assert (code, err) == (0, "")
    assert out == CASE_TEMPLATE
    file = tmp_path / "case.toml"
    file.write_text(out, encoding="utf-8")
    code, out, err = case("check", file)
    assert (code, err) == (0, "")
    document = tomllib.loads(CASE_TEMPLATE)
    surfaces, modes = len(document["surface"]), 1 + len(document["mode"])
    assert out.startswith(f"{file}: ok, {surfaces} surfaces, {modes} modes")


def test_new_writes_a_file_once(case, tmp_path):
    file = tmp_path / "mine.toml"
    code, out, err = case("new", "--out", file)
    assert (code, out) == (0, "")
    assert str(file) in err
    assert file.read_text(encoding="utf-8") == CASE_TEMPLATE
    file.write_text("precious", encoding="utf-8")
    code, out, err = case("new", "--out", file)
    assert (code, out) == (2, "")
    assert "exists" in err
    assert "--force" in err
    assert file.read_text(encoding="utf-8") == "precious"
    assert case("new", "--out", file, "--force")[0] == 0
    assert file.read_text(encoding="utf-8") == CASE_TEMPLATE
    assert list(tmp_path.iterdir()) == [file]


def test_new_takes_the_file_as_its_argument(case, tmp_path):
    file = tmp_path / "mine.toml"
    assert case("new", file)[0] == 0
    assert file.read_text(encoding="utf-8") == CASE_TEMPLATE
    assert case("new", file)[0] == 2
    code, _, err = case("new", file, "--out", tmp_path / "other.toml")
    assert (code, (tmp_path / "other.toml").exists()) == (2, False)
    assert "one of them" in err


def test_new_does_not_follow_a_dangling_link_without_force(case, tmp_path):
    link = tmp_path / "link.toml"
    link.symlink_to(tmp_path / "elsewhere.toml")
    assert case("new", "--out", link)[0] == 2
    assert not (tmp_path / "elsewhere.toml").exists()


def test_new_cannot_write(case, tmp_path):
    for place in (tmp_path, tmp_path / "none" / "case.toml"):
        code, out, err = case("new", "--out", place)
        assert (code, out) == (2, "")
        assert err.startswith("error: --out ")


def test_check_names_file_and_line(case, tmp_path):
    file = tmp_path / "case.toml"
    bad = CASE_TEMPLATE.replace('"oxidised aluminium"', '"oxidised aluminum"')
    file.write_text(bad, encoding="utf-8")
    line = next(i for i, text in enumerate(bad.splitlines(), 1) if "oxidised aluminum" in text)
    code, out, err = case("check", file)
    assert (code, out) == (2, "")
    assert err.startswith(f"error: {file}:{line}: ")
    assert 'Nearest: "oxidised aluminium"' in err


def test_check_of_no_case(case, tmp_path):
    for place in (tmp_path, tmp_path / "gone.toml"):
        code, out, err = case("check", place)
        assert (code, out) == (2, "")
        assert err.startswith("error: ")
    assert case("check")[0] == 2


def test_check_permits_outside_files_on_request_only(case, tmp_path):
    from materials.library import library_text

    (tmp_path / "metal.toml").write_text(library_text("gold"), encoding="utf-8")
    folder = tmp_path / "inner"
    folder.mkdir()
    file = folder / "case.toml"
    file.write_text(
        CASE_TEMPLATE.replace('"oxidised aluminium"', '"../metal.toml"'), encoding="utf-8"
    )
    code, _, err = case("check", file)
    assert code == 2
    assert "--allow-outside" in err
    assert case("check", file, "--allow-outside")[0] == 0


def test_schema_is_json_schema_of_the_tables(case):
    code, out, err = case("schema")
    assert (code, err) == (0, "")
    schema = json.loads(out)
    assert {"title", "orbit", "plasma", "body", "surface"} <= set(schema["required"])
    assert set(tomllib.loads(CASE_TEMPLATE)) <= set(schema["properties"])
    assert schema["additionalProperties"] is False
