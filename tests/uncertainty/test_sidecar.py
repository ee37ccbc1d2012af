"""What a side-car without mistakes says."""

from __future__ import annotations

import datetime as dt
from pathlib import Path

import pytest

from cellsim.uncertainty.sidecar import Formula, Sidecar, load_sidecar

STUDY = '''\
[model]
workbook = "models/larkholm_ferries.xlsx"
as_of = 2026-06-30

[run]
draws = 100_000
seed = 0
sampling = "random"

[inputs.passenger_growth]
cell = "Inputs!C6"
label = "Passenger growth"
distribution = "lognormal"
mean = "=Inputs!C6"
sd = "2.5%"
shift = -0.05
floor = 0
cap = "= Inputs!C7 * 2"
note = """spread of
ten years"""
source = "harbour office"
unit = "% a year"
replace_formula = true

[inputs.new_berth]
cell = "berth_built"
distribution = "discrete"
values = [0, 1, "=Inputs!C8"]
weights = ["35%", 0.4, 0.25]

[inputs.fuel]
cell = "Inputs!C10"
distribution = "normal"
p10 = 60
p90 = 95

[[dependence]]
inputs = ["passenger_growth", "fuel"]
rank_correlation = "-30%"

[outputs.value_per_share]
cell = "Valuation!D30"
unit = "EUR"
label = "Value per share"
thresholds = [4.20, "=Market!B2", "10%"]

[outputs.upside]
formula = "=Valuation!D30 / Market!B2 - 1"
'''


@pytest.fixture
def study(tmp_path: Path) -> Sidecar:
    return load(tmp_path, STUDY)


def load(folder: Path, text: str) -> Sidecar:
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    return load_sidecar(path)


def test_model_is_found_beside_the_sidecar(study: Sidecar, tmp_path: Path) -> None:
    assert study.workbook == tmp_path / "models" / "larkholm_ferries.xlsx"
    assert study.path == tmp_path / "study.toml"
    assert study.as_of == dt.date(2026, 6, 30)
    assert study.text == STUDY
    assert study.iterate is False


def test_seed_zero_is_kept(study: Sidecar) -> None:
    assert (study.run.draws, study.run.seed, study.run.sampling) == (100_000, 0, "random")


def test_input_carries_numbers_percentages_and_formulas(study: Sidecar) -> None:
    growth = study.inputs[0]

    assert growth.parameters == {"mean": Formula("Inputs!C6", 14), "sd": 0.025, "shift": -0.05}
    assert (growth.floor, growth.cap) == (0.0, Formula("Inputs!C7 * 2", 18))
    assert growth.replace_formula is True
    assert (growth.name, growth.cell, growth.label) == (
        "passenger_growth",
        "Inputs!C6",
        "Passenger growth",
    )
    assert (growth.note, growth.source) == ("spread of\nten years", "harbour office")
    assert growth.unit == "% a year"


def test_input_knows_its_lines(study: Sidecar) -> None:
    growth = study.inputs[0]

    assert growth.line == 10
    assert growth.lines["sd"] == 15
    assert growth.lines["source"] == 21


def test_list_may_hold_formulas(study: Sidecar) -> None:
    berth = study.inputs[1]

    assert berth.parameters["values"] == (0.0, 1.0, Formula("Inputs!C8", 28))
    assert berth.parameters["weights"] == (0.35, 0.4, 0.25)
    assert berth.label is None
    assert berth.replace_formula is False
    assert (berth.note, berth.source, berth.unit) == ("", "", "")
    assert (berth.floor, berth.cap) == (None, None)


def test_one_correlation_fills_the_matrix(study: Sidecar) -> None:
    (dependence,) = study.dependence

    assert dependence.inputs == ("passenger_growth", "fuel")
    assert dependence.rank_correlation == ((1.0, -0.3), (-0.3, 1.0))
    assert dependence.line == 37


def test_outputs_are_cells_or_formulas(study: Sidecar) -> None:
    value, upside = study.outputs

    assert (value.cell, value.formula) == ("Valuation!D30", None)
    assert value.thresholds == (4.2, Formula("Market!B2", 45), 0.1)
    assert (value.unit, value.label) == ("EUR", "Value per share")
    assert (upside.cell, upside.formula) == (None, "Valuation!D30 / Market!B2 - 1")
    assert (upside.name, upside.line, upside.lines) == ("upside", 47, {"formula": 48})


SHORT = """\
[model]
workbook = "m.xlsx"
[inputs.x]
cell = "A!B1"
distribution = "uniform"
low = 0
high = 1
[outputs.y]
cell = "A!B2"
"""


def test_run_section_may_be_left_out(tmp_path: Path) -> None:
    study = load(tmp_path, SHORT)

    assert (study.run.draws, study.run.seed, study.run.sampling) == (10_000, 1, "latin-hypercube")
    assert study.as_of is None
    assert study.dependence == ()


def test_absolute_model_path_stays(tmp_path: Path) -> None:
    workbook = tmp_path / "elsewhere" / "m.xlsx"

    study = load(tmp_path, SHORT.replace('"m.xlsx"', f"'{workbook}'"))

    assert study.workbook == workbook


def test_as_of_may_carry_a_time(tmp_path: Path) -> None:
    study = load(tmp_path, SHORT.replace('"m.xlsx"', '"m.xlsx"\nas_of = 2026-06-30T18:30:00'))

    assert study.as_of == dt.datetime(2026, 6, 30, 18, 30)  # noqa: DTZ001


def test_model_may_ask_for_iteration(tmp_path: Path) -> None:
    assert load(tmp_path, SHORT.replace('"m.xlsx"', '"m.xlsx"\niterate = true')).iterate is True


def test_byte_order_mark_and_windows_line_ends_are_read(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_bytes(b"\xef\xbb\xbf" + SHORT.replace("\n", "\r\n").encode())

    study = load_sidecar(path)

    assert study.inputs[0].lines["high"] == 7


def test_percentage_is_the_nearest_number_to_its_decimal_value(tmp_path: Path) -> None:
    study = load(tmp_path, SHORT.replace("low = 0\n", 'low = " 0.7 %"\n'))

    assert study.inputs[0].parameters["low"] == 0.007


def test_full_matrix_is_kept(tmp_path: Path) -> None:
    text = (
        SHORT
        + """\
[inputs.z]
cell = "A!B3"
distribution = "bernoulli"
probability = 0.5
[[dependence]]
inputs = ["z", "x"]
rank_correlation = [[1, 0.5], [0.5, 1]]
"""
    )

    study = load(tmp_path, text)

    assert study.dependence[0].inputs == ("z", "x")
    assert study.dependence[0].rank_correlation == ((1.0, 0.5), (0.5, 1.0))
    assert study.dependence[0].line == 14
