"""An output with a spike of failures and a few large successes must read as what it is."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest

from cellsim.report.figures import work_out
from cellsim.report.wording import cautions, output_sentences
from cellsim.report.write import write_report

Made = Callable[..., Any]
DASHED = "#,##0.0;-#,##0.0;-"
FAILED, SUCCEEDED = 9_400, 600


def _draws() -> np.ndarray:
    rng = np.random.default_rng(11)
    return np.concatenate((rng.uniform(-60, -5, FAILED), rng.normal(900, 50, SUCCEEDED)))


def test_sentence_tells_the_mean_on_both_sides_of_the_threshold(
    make_run: Made, output_record: Made
) -> None:
    draws = _draws()
    record = output_record("value", base=900.0, thresholds=(0.0,), number_format=DASHED)
    text = output_sentences(work_out(make_run([(record, draws)])).outputs[0])
    assert "6.0 % of the draws lie above 0.0 EUR. Their mean is " in text
    plain = text.replace("\u2212", "-").split("Their mean is ")[1]
    above, others = (float(part.split(" EUR")[0]) for part in plain.split(", that of the others "))
    assert above == pytest.approx(draws[draws > 0].mean(), abs=1)
    assert others == pytest.approx(draws[draws <= 0].mean(), abs=0.1)


def test_a_mean_outside_the_central_range_is_a_caution(make_run: Made, output_record: Made) -> None:
    record = output_record("value", base=20.0)
    results = make_run([(record, _draws())])
    found = cautions(results, work_out(results))
    assert any("a few far-off draws carry it" in text for text in found)
    plain = make_run([(record, np.random.default_rng(3).normal(20, 5, 5_000))])
    assert not any("far-off" in text for text in cautions(plain, work_out(plain)))


def test_few_values_are_named_and_no_means_are_told(make_run: Made, output_record: Made) -> None:
    record = output_record("launched", 1.0, thresholds=(0.5,), unit="", number_format="General")
    text = output_sentences(work_out(make_run([(record, [0.0] * 934 + [1.0] * 66)])).outputs[0])
    assert "0 in 93.4 % of the draws and 1 in 6.6 %" in text
    assert "Their mean" not in text


def test_a_zero_shows_although_the_model_writes_a_dash(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    """LibreOffice and others write `-` for a threshold of 0 under the model's own format."""
    record = output_record("value", base=900.0, thresholds=(0.0,), number_format=DASHED)
    write_report(make_run([(record, _draws())]), tmp_path / "run.xlsx")
    sheet = openpyxl.load_workbook(tmp_path / "run.xlsx")["Headline"]
    cells = [cell for row in sheet.iter_rows() for cell in row if cell.value == 0]
    formats = {cell.number_format for cell in cells if cell.number_format.startswith("#,##0.0")}
    assert formats == {"#,##0.0;-#,##0.0;#,##0.0"}
