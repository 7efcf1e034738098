"""The plasma catalogue and the reader of plasma documents."""

import ast
import copy
import tomllib
from importlib.resources import files

import pytest
from scipy.constants import atomic_mass

from environments.catalogue import (
    NAME_PATTERN,
    library_text,
    load_plasma,
    plasma_names,
    read_plasma,
)
from environments.errors import EnvironmentDataError

DOCUMENT = {
    "title": "A plasma",
    "source": "example",
    "population": [
        {"species": "electron", "density_m3": 1e6, "temperature_eV": 10.0},
        {"mass_u": 32.0, "charge_number": 1, "density_m3": 1e6, "temperature_eV": 1.0},
    ],
}

# As printed: electrons and ions, (density [cm-3], temperature [keV]).
# ECSS-E-ST-10-04C (2008) table 8-1 and NASA TP-2361 (1984), both from memory.
PRINTED = {
    "ECSS geostationary worst case": (
        [(0.2, 0.4), (1.2, 27.5)],
        [(0.6, 0.2), (1.3, 28.0)],
    ),
    "NASA geostationary 90 percent": ([(1.12, 12.0)], [(0.236, 29.5)]),
    "substorm, 3 keV class": ([(1.5, 3.0)], [(1.2, 9.0)]),
}


def test_names_that_reports_and_cases_rely_on():
    assert {
        "quiet geostationary",
        "ECSS geostationary worst case",
        "NASA geostationary 90 percent",
        "substorm, 3 keV class",
        "ECSS auroral worst case",
        "solar wind at 1 AU",
    } <= set(plasma_names())


@pytest.mark.parametrize("name", plasma_names())
def test_every_entry_has_name_source_basis_and_both_charges(name):
    plasma = load_plasma(name)
    document = tomllib.loads(library_text(name))
    assert plasma.name == name == document["name"]
    assert NAME_PATTERN.fullmatch(name)
    assert "basis" in document  # never by default within the package
    assert plasma.title
    assert plasma.source
    assert {p.species.charge_number < 0 for p in plasma.populations} == {True, False}
    assert load_plasma(name) is plasma


@pytest.mark.parametrize("name", sorted(PRINTED))
def test_figures_are_used_as_printed(name):
    electrons, ions = PRINTED[name]
    found = [
        (p.species.name, p.density_m3, p.temperature_eV) for p in load_plasma(name).populations
    ]
    expected = [("electron", n * 1e6, T * 1e3) for n, T in electrons]
    expected += [("H+", n * 1e6, T * 1e3) for n, T in ions]
    assert [x[0] for x in found] == [x[0] for x in expected]
    for ours, printed in zip(found, expected, strict=True):
        assert ours[1:] == pytest.approx(printed[1:], rel=1e-12)


def test_assumed_entries_say_so():
    assert load_plasma("quiet geostationary").basis == "assumed"
    assert load_plasma("substorm, 3 keV class").basis == "assumed"
    assert load_plasma("ECSS geostationary worst case").basis == "memory"


def test_unknown_name_offers_the_nearest():
    for call in (load_plasma, library_text):
        with pytest.raises(EnvironmentDataError) as caught:
            call("ecss geostationary worst-case")
        assert caught.value.nearest == "ECSS geostationary worst case"
        assert "\n" not in str(caught.value)


def test_reads_own_species_and_defaults():
    plasma = read_plasma(DOCUMENT)
    ion = plasma.populations[1].species
    assert ion.mass_kg == pytest.approx(32.0 * atomic_mass)
    assert ion.charge_number == 1
    assert (plasma.name, plasma.basis, plasma.clause, plasma.note) == (
        "A plasma",
        "assumed",
        None,
        "",
    )


def changed(path, value):
    document = copy.deepcopy(DOCUMENT)
    target = document
    for step in path[:-1]:
        target = target[step]
    if value is None:
        del target[path[-1]]
    else:
        target[path[-1]] = value
    return document


@pytest.mark.parametrize(
    ("path", "value"),
    [
        (("title",), None),
        (("title",), ""),
        (("title",), 3),
        (("source",), None),
        (("basis",), "rumour"),
        (("name",), "../up"),
        (("clause",), 8.2),
        (("note",), ["x"]),
        (("populations",), []),
        (("population",), None),
        (("population",), []),
        (("population",), "electron"),
        (("population", 0), 5),
        (("population", 0, "species"), None),
        (("population", 0, "species"), "electrons"),
        (("population", 0, "mass_u"), 1.0),
        (("population", 0, "law"), "kappa"),
        (("population", 0, "kappa"), 4.0),
        (("population", 0, "density_m3"), None),
        (("population", 0, "density_m3"), True),
        (("population", 0, "density_m3"), "1e6"),
        (("population", 0, "density_m3"), float("nan")),
        (("population", 0, "density_m3"), float("inf")),
        (("population", 0, "density_m3"), 0.0),
        (("population", 0, "density_m3"), -1e6),
        (("population", 0, "temperature_eV"), None),
        (("population", 0, "temperature_eV"), 0),
        (("population", 0, "temperature_eV"), 1e9),
        (("population", 1, "mass_u"), None),
        (("population", 1, "mass_u"), -1.0),
        (("population", 1, "charge_number"), None),
        (("population", 1, "charge_number"), 0),
        (("population", 1, "charge_number"), 1.0),
        (("population", 1, "charge_number"), True),
    ],
)
def test_bad_documents_name_the_key(path, value):
    with pytest.raises(EnvironmentDataError) as caught:
        read_plasma(changed(path, value))
    key = caught.value.key
    assert key[: len(path)] == path or path[:-1] == key[:-1]
    assert "\n" not in str(caught.value)


def test_integers_beyond_floats_are_out_of_range():
    for power in (2000, 20000):  # the second is too long to print
        with pytest.raises(EnvironmentDataError, match="out of range"):
            read_plasma(changed(("population", 0, "density_m3"), 1 << power))


def test_law_error_names_what_is_allowed():
    with pytest.raises(EnvironmentDataError) as caught:
        read_plasma(changed(("population", 1, "law"), "kapa"))
    assert str(caught.value) == (
        'population[1].law = "kapa" is not known here; allowed: "maxwellian", "kappa", '
        '"fontheim", "flat and maxwellian", "tabulated"; nearest: "kappa"'
    )


def test_a_document_must_be_a_table():
    with pytest.raises(EnvironmentDataError, match="not a table"):
        read_plasma([1, 2])


def test_error_shows_odd_texts_on_one_line():
    error = EnvironmentDataError("is odd", key=("a", 1, "b"), value="two\nlines")
    assert str(error) == 'a[1].b = "two\\nlines" is odd'
    assert str(error.below("case")).startswith("case.a[1].b")
    assert len(str(EnvironmentDataError("is long", value=list(range(500))))) < 120
    assert len(str(EnvironmentDataError("is long", value="x" * 500))) < 120
    assert str(EnvironmentDataError("is fine", value="é")) == '"é" is fine'


def test_environments_import_neither_materials_nor_charging():
    for entry in files("environments").iterdir():
        if entry.name.endswith(".py"):
            for node in ast.walk(ast.parse(entry.read_text(encoding="utf-8"))):
                names = (
                    [alias.name for alias in node.names]
                    if isinstance(node, ast.Import)
                    else [node.module or ""]
                    if isinstance(node, ast.ImportFrom)
                    else []
                )
                assert not [n for n in names if n.split(".")[0] in ("materials", "charging")]


@pytest.mark.parametrize(
    ("law", "key", "nearest", "owner"),
    [
        ("maxwellian", "spectrum_fil", "spectrum_file", "tabulated"),
        ("maxwellian", "spectrum_file", None, "tabulated"),
        ("maxwellian", "pitch_angl", "pitch_angle", "fontheim"),
        ("kappa", "pitch_angle", None, "flat and maxwellian"),
        ("fontheim", "pitch_angel", "pitch_angle", None),
        ("tabulated", "spectrumfile", "spectrum_file", None),
        ("maxwellian", "temprature_eV", "temperature_eV", None),
    ],
)
def test_a_key_of_another_law_is_named_with_its_law(law, key, nearest, owner):
    row = {"species": "electron", "law": law, key: "isotropic"}
    with pytest.raises(EnvironmentDataError) as caught:
        read_plasma({"title": "t", "source": "t", "population": [row]})
    assert caught.value.key == ("population", 0, key)
    assert caught.value.nearest == nearest
    assert (f'"{owner}"' in caught.value.problem) == (owner is not None)
