"""Wording of errors, after the examples of the project's style."""

import pickle
import subprocess
import sys

import pytest

from charging.errors import (
    HalflitError,
    InputError,
    NoSolutionError,
    Problem,
    ProblemsFound,
    printable,
)


def test_input_error_reads_as_in_the_style() -> None:
    error = InputError(
        'surface "aft blanket": material = "polyimid" is unknown',
        file="cases/geo_day.toml",
        line=41,
        key=("surface", 3, "material"),
        value="polyimid",
        nearest="polyimide film",
        next_step="All names: halflit materials",
    )
    assert str(error) == (
        'cases/geo_day.toml:41: surface "aft blanket": material = "polyimid" is unknown.\n'
        '       Nearest: "polyimide film". All names: halflit materials'
    )
    assert error.key == ("surface", 3, "material")
    assert isinstance(error, HalflitError)


@pytest.mark.parametrize(
    ("error", "text"),
    [
        (InputError("no"), "no."),
        (InputError("no", file="a b.toml"), "a b.toml: no."),
        (
            InputError("no", allowed="1, 2", more=2),
            "no.\n       Allowed: 1, 2.\n       (and 2 more)",
        ),
        (InputError("no", file="a\n\x1b[31m", line=1), "a\\n\\x1b[31m:1: no."),
        (NoSolutionError("no root", next_step="Try: x"), "no root.\n       Try: x"),
        (NoSolutionError("no root."), "no root."),
    ],
)
def test_parts_that_are_absent_leave_no_trace(error: HalflitError, text: str) -> None:
    assert str(error) == text


def test_no_solution_carries_its_data() -> None:
    error = NoSolutionError("no step", time="2031-03-20T00:41:07Z", surface="aft blanket")
    assert (error.time, error.surface) == ("2031-03-20T00:41:07Z", "aft blanket")


def test_errors_survive_the_way_between_processes() -> None:
    error = pickle.loads(pickle.dumps(InputError("no", file="a.toml", line=3, more=1)))
    assert str(error) == str(InputError("no", file="a.toml", line=3, more=1))


def test_problems_are_named_in_their_own_text() -> None:
    found = ProblemsFound([Problem(("a", 0), "is wrong"), Problem((), "alone", sentence=True)])
    assert str(found) == "a.0 is wrong; alone"


def test_printable_cuts_and_escapes() -> None:
    assert printable("a\tb\u202e") == "a\\tb\\u202e"
    assert printable("x" * 200) == "x" * 120 + "…"


def test_reading_the_errors_loads_nothing_heavy() -> None:
    code = (
        "import sys, charging, charging.errors, charging.case_template;"
        "print([m for m in ('numpy', 'scipy', 'xarray', 'pydantic') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
