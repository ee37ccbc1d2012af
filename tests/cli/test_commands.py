"""The commands as a person types them, right and wrong."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import openpyxl
import pytest

SAMPLES = Path(__file__).resolve().parents[2] / "sample_workbooks"
GOOD = (SAMPLES / "larkholm_ferries.toml").read_text()


def cellsim(*arguments: str | Path) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "cellsim", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, check=False)


@pytest.fixture
def study(tmp_path: Path) -> Path:
    shutil.copy(SAMPLES / "larkholm_ferries.xlsx", tmp_path)
    path = tmp_path / "larkholm_ferries.toml"
    path.write_text(GOOD)
    return path


def test_check_agrees_on_the_sample() -> None:
    done = cellsim("check", SAMPLES / "larkholm_ferries.xlsx", "--json")
    assert done.returncode == 0, done.stderr
    outcome = json.loads(done.stdout)
    assert outcome["compared"] == outcome["agreeing"] > 300


def test_check_exits_with_1_and_names_the_root_when_a_value_disagrees(tmp_path: Path) -> None:
    """One stored value is changed in the file: that cell disagrees, and nothing that reads it does."""
    source, changed = SAMPLES / "larkholm_ferries.xlsx", tmp_path / "changed.xlsx"
    with zipfile.ZipFile(source) as before, zipfile.ZipFile(changed, "w") as after:
        for name in before.namelist():
            content = before.read(name).decode("utf-8", "surrogateescape")
            if name == "xl/worksheets/sheet5.xml":
                assert content.count("<v>201600</v>") == 1  # 8.40 EUR times 24,000 thousand shares
                content = content.replace("<v>201600</v>", "<v>201601</v>")
            after.writestr(name, content.encode("utf-8", "surrogateescape"))
    done = cellsim("check", changed, "--json")
    assert done.returncode == 1, done.stderr
    wrong = json.loads(done.stdout)["disagreements"]
    assert [(row["cell"], row["stored"], row["root"]) for row in wrong] == [
        ("Market!B4", 201601.0, True)
    ]


def test_check_compares_with_another_workbook_and_writes_what_it_found(tmp_path: Path) -> None:
    """The ferry company's model with another share price against the sample itself."""
    book = openpyxl.load_workbook(SAMPLES / "larkholm_ferries.xlsx")
    book["Market"]["B2"] = 9.0
    book.save(tmp_path / "changed.xlsx")
    written = tmp_path / "check.xlsx"
    options = ["--against", SAMPLES / "larkholm_ferries.xlsx", "--results", written]
    done = cellsim("check", tmp_path / "changed.xlsx", *options)
    assert done.returncode == 1, done.stderr
    assert "1 constant differs" in done.stdout
    assert "Market!B4" in done.stdout
    sheet = openpyxl.load_workbook(written)["Model check"]
    rows = [[cell.value for cell in row] for row in sheet.iter_rows()]
    assert ["Market", 1, 0, 1] in [row[:4] for row in rows]
    found = next(row for row in rows if row[0] == "Market!B4")
    assert found[1:4] == ["=B2*B3", 201600, 216000]
    again = cellsim("check", tmp_path / "changed.xlsx", *options)
    assert again.returncode == 5
    assert "exists already" in again.stderr


def test_check_passes_over_formulas_without_stored_values(tmp_path: Path) -> None:
    book = openpyxl.load_workbook(SAMPLES / "larkholm_ferries.xlsx")
    book.save(tmp_path / "without_values.xlsx")
    done = cellsim("check", tmp_path / "without_values.xlsx", "--json")
    outcome = json.loads(done.stdout)
    assert (done.returncode, outcome["compared"]) == (0, 0)
    assert outcome["without_value"] > 300


def test_run_writes_the_results_and_leaves_the_model_alone(study: Path) -> None:
    model = study.with_suffix(".xlsx")
    before = model.read_bytes()
    done = cellsim("run", study, "--draws", "2000", "--json")
    assert done.returncode == 0, done.stderr
    outcome = json.loads(done.stdout)
    assert outcome["failed_draws"] == 0
    assert model.read_bytes() == before
    names = openpyxl.load_workbook(study.with_name("larkholm_ferries.results.xlsx")).sheetnames
    assert {"Headline", "Quantiles", "Distribution", "Inputs", "Model check", "Run record"} <= set(
        names
    )
    again = cellsim("run", study, "--draws", "2000", "--json")
    assert again.returncode == 5
    assert "exists already" in again.stderr
    third = cellsim("run", study, "--draws", "2000", "--json", "--overwrite", "--threads", "1")
    assert json.loads(third.stdout)["outputs"] == outcome["outputs"]


WRONG = [
    ('cell = "Inputs!C8"', 'cell = "Imputs!C8"', "did you mean 'Inputs'", 4),
    ('cell = "Inputs!C8"', 'cell = "Inputs!C32"', "holds a formula", 4),
    ('label = "Fuel price"', 'label = "Fuel prise"', "expected 'Fuel prise'", 4),
    ('cell = "Inputs!C14"', 'cell = "Inputs!C8"', "already the input", 4),
    ('cell = "Valuation!D18"', 'cell = "Market!B3"', "does not depend on any input", 4),
    ("low = 22\n", "low = 27\n", "low", 4),
    ("weights = [0.35, 0.65]", "weights = [0.35, 0.6]", "weights", 4),
    ("rank_correlation = 0.4", "rank_correlation = 1.4", "1.4", 4),
    ("draws = 100_000", "draws = 0", "draws", 4),
    ('distribution = "pert"', 'distribution = "perl"', "pert", 4),
    ("seed = 4711", "sede = 4711", "seed", 4),
    ("[run]", "[run", "TOML", 4),
    ('workbook = "larkholm_ferries.xlsx"', 'workbook = "larkholm.xlsx"', "is not there", 4),
]


@pytest.mark.parametrize(("old", "new", "words", "status"), WRONG)
def test_wrong_side_cars_are_answered_with_place_and_hint(
    study: Path, old: str, new: str, words: str, status: int
) -> None:
    assert old in GOOD
    study.write_text(GOOD.replace(old, new, 1))
    done = cellsim("run", study)
    assert done.returncode == status, done.stderr
    assert words in done.stderr
    assert "larkholm_ferries.toml" in done.stderr
    assert "Traceback" not in done.stderr
    assert not study.with_name("larkholm_ferries.results.xlsx").exists()


def test_a_missing_model_and_wrong_usage_have_their_own_statuses(tmp_path: Path) -> None:
    assert cellsim("check", tmp_path / "missing.xlsx").returncode == 3
    assert cellsim("run", tmp_path / "missing.toml").returncode == 4
    assert cellsim("chek").returncode == 2
    assert (
        cellsim(
            "run",
            SAMPLES / "larkholm_ferries.toml",
            "--draws",
            "0",
            "--results",
            tmp_path / "r.xlsx",
        ).returncode
        == 2
    )
    assert (
        cellsim(
            "run", SAMPLES / "larkholm_ferries.toml", "--results", tmp_path / "no" / "r.xlsx"
        ).returncode
        == 5
    )


def test_explain_shows_labels_steps_and_the_nearest_name() -> None:
    model = SAMPLES / "larkholm_ferries.xlsx"
    done = cellsim("explain", model, "ShareValue", "--json")
    assert done.returncode == 0, done.stderr
    outcome = json.loads(done.stdout)
    assert outcome["cell"] == "Valuation!D30"
    assert outcome["formula"] == "=D27/D28"
    assert [row["label"] for row in outcome["reads"]] == ["Equity value, not below zero", "Shares"]
    assert outcome["steps"][-1]["value"] == outcome["value"]
    assert abs(outcome["stored"] - outcome["value"]) < 1e-13  # stored with 15 digits
    text = cellsim("explain", model, "Valuation!D15")
    assert "Terminal value" in text.stdout
    parts = text.stdout.partition("step by step")[2].split("\n")
    assert not any(line.strip().startswith("NA()") for line in parts)  # a branch not taken
    wrong = cellsim("explain", model, "ShareValu")
    assert wrong.returncode == 3
    assert "did you mean 'ShareValue'?" in wrong.stderr
