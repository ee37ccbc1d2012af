"""What stands on the sheets, read back from the file."""

from __future__ import annotations

import re
import zipfile
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any
from xml.etree import ElementTree as ET

import numpy as np
import openpyxl
import pytest
from openpyxl.workbook import Workbook

from cellsim.report.wording import CAUTION
from cellsim.report.write import write_report
from cellsim.results import DependencePair, FailedDraw, Failures, RunResults, Threshold
from cellsim.values import ErrorValue, encode_error

Made = Callable[..., Any]
HOSTILE = (
    "=1+1",
    "+x",
    "@x",
    "-2+3",
    "{=1}",
    "<r>bold</r>",
    "http://example.invalid/",
    "a\x00b\x07\x1b\ud800\ufffe",
    "_x0041_",
    "שלום ← emoji 🛳",
    "line one\r\nline two",
    "y" * 40_000,
)


def opened(results: RunResults, folder: Path, **options: Any) -> Workbook:
    path = folder / "run.xlsx"
    write_report(results, path, overwrite=True, **options)
    check_parts(path)
    return openpyxl.load_workbook(path)


def check_parts(path: Path) -> None:
    """Every part is well-formed; no stored number is infinite or not a number; links stay inside."""
    with zipfile.ZipFile(path) as package:
        assert package.testzip() is None
        for name in package.namelist():
            text = package.read(name).decode("utf-8")
            root = ET.fromstring(text)
            if name.startswith("xl/worksheets/sheet"):
                values = [v.text or "" for v in root.iter("{*}v")]
                assert not [v for v in values if re.search("inf|nan", v, re.IGNORECASE)]
                for row in root.iter("{*}row"):
                    assert float(row.get("ht", "0")) <= 409
            if name.endswith(".rels"):
                assert 'TargetMode="External"' not in text


def texts(book: Workbook, sheet: str) -> list[str]:
    return [
        str(cell.value) for row in book[sheet].iter_rows() for cell in row if cell.value is not None
    ]


def formulas(book: Workbook) -> Iterator[tuple[str, str]]:
    for sheet in book:
        for row in sheet.iter_rows():
            for cell in row:
                if cell.data_type == "f":
                    yield sheet.title, str(cell.value)


def test_sheets_come_in_order_and_empty_ones_are_left_out(
    ferry_run: RunResults, make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    book = opened(ferry_run, tmp_path, draws_sheet=True)
    assert book.sheetnames == [
        "Headline", "Quantiles", "Distribution", "Inputs", "Dependence", "Failed draws", "Model check",
        "Run record", "Draws",
    ]  # fmt: skip
    small = make_run([(output_record("value"), [1.0, 2.0, 3.0])])
    assert opened(small, tmp_path).sheetnames == [
        "Headline", "Quantiles", "Distribution", "Inputs", "Model check", "Run record",
    ]  # fmt: skip


def test_headline_says_what_the_draws_say(ferry_run: RunResults, tmp_path: Path) -> None:
    words = " ".join(texts(opened(ferry_run, tmp_path), "Headline"))
    value = ferry_run.output_draws[0][np.isfinite(ferry_run.output_draws[0])]
    assert f"the median is {np.median(value):.2f} EUR" in words
    assert f"{(value > 4.2).mean() * 100:.1f} % of the draws lie above 4.20 EUR." in words
    low, high = np.quantile(value, [0.1, 0.9])
    assert f"the central 80 % of the draws run from {low:.2f} EUR to {high:.2f} EUR" in words
    assert "5,000 draws (Latin hypercube sampling, seed 4711) of 3 uncertain inputs" in words
    assert "The base case is the error #N/A." in words


def test_headline_warns_of_what_stands_out(ferry_run: RunResults, tmp_path: Path) -> None:
    words = " ".join(texts(opened(ferry_run, tmp_path), "Headline"))
    assert f"{ferry_run.failures.draws} draws" in words
    assert "2 formulas whose recalculated value differs" in words
    assert "WEBSERVICE" in words
    assert "Fuel price (95.00 EUR/t) lies above its 95 % quantile" in words
    assert "New berth" not in words.split("To be careful of")[1]


def test_nothing_is_warned_of_without_reason(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(4, 1, 20_000)
    words = texts(opened(make_run([(output_record("value"), draws)]), tmp_path), "Headline")
    assert "Nothing stood out in the draws, the inputs or the model check." in words


@pytest.mark.parametrize("sheet", ["Headline", "Run record"])
def test_caution_stands_on_the_first_sheet_and_the_record(
    sheet: str, ferry_run: RunResults, tmp_path: Path
) -> None:
    assert CAUTION in texts(opened(ferry_run, tmp_path), sheet)


def test_quantile_table_holds_the_quantiles(ferry_run: RunResults, tmp_path: Path) -> None:
    sheet = opened(ferry_run, tmp_path)["Quantiles"]
    value = ferry_run.output_draws[0][np.isfinite(ferry_run.output_draws[0])]
    rows = list(sheet.iter_rows(min_row=9, max_row=113, max_col=4, values_only=True))
    assert [rows[0][0], rows[-1][0], len(rows)] == [0, 1, 105]
    probabilities = [float(str(row[0])) for row in rows]
    assert [row[1] for row in rows] == pytest.approx(
        np.quantile(value, probabilities).tolist(), rel=1e-12
    )
    median = rows[probabilities.index(0.5)]
    assert float(str(median[2])) < float(str(median[1])) < float(str(median[3]))


def test_quantiles_come_in_the_models_number_format(ferry_run: RunResults, tmp_path: Path) -> None:
    sheet = opened(ferry_run, tmp_path)["Quantiles"]
    assert sheet["B20"].number_format == "0.00"


def test_only_the_look_up_has_formulas(ferry_run: RunResults, tmp_path: Path) -> None:
    found = list(formulas(opened(ferry_run, tmp_path, draws_sheet=True)))
    assert {sheet for sheet, _ in found} == {"Quantiles"}
    assert len(found) == 3 * len(ferry_run.outputs)
    names = set(re.findall(r"[A-Z]+(?=\()", " ".join(formula for _, formula in found)))
    assert names <= {"IF", "INDEX", "MATCH", "ROWS"}


@pytest.mark.parametrize("text", HOSTILE)
def test_text_from_outside_stays_text(
    text: str, make_run: Made, output_record: Made, input_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(4, 1, 500)
    threshold = [Threshold("=" + text, 4.2)]
    results = make_run(
        [
            (
                replace(
                    output_record(text, label=text, unit=text, place=text),
                    thresholds=tuple(threshold),
                ),
                draws,
            )
        ],
        [
            (
                input_record(
                    text,
                    label=text,
                    unit=text,
                    place=text,
                    distribution=text,
                    note=text,
                    source=text,
                ),
                draws,
            )
        ],
        dependence=(DependencePair(text, text, 0.1, 0.1),),
        failures=Failures(
            1, {(text, text): 1}, (FailedDraw(1, text, text, text, text, {text: 1.0}),)
        ),
    )
    record = replace(
        results.record, model=text, sidecar=text, sidecar_text=text, command=text, sampling=text,
        versions={text: text}, engine={text: text}, slow_cells=((text, text),),
    )  # fmt: skip
    book = opened(replace(results, record=record), tmp_path, draws_sheet=True)
    assert {sheet for sheet, _ in formulas(book)} == {"Quantiles"}
    assert not [s for s, f in formulas(book) if not re.match(r"=IF\(|=1-", f)]
    lengths = [
        len(value.encode("utf-16-le")) // 2 for s in book.sheetnames for value in texts(book, s)
    ]
    assert max(lengths) <= 32_767


def test_sidecar_is_kept_line_by_line_as_text(ferry_run: RunResults, tmp_path: Path) -> None:
    sheet = opened(ferry_run, tmp_path)["Run record"]
    column = [row[0].value or "" for row in sheet.iter_rows(max_col=1)]
    start = column.index("Side-car, line by line") + 1
    assert column[start:] == ferry_run.record.sidecar_text.split("\n")[: len(column) - start]
    assert "=1+1" in column[start:]


def test_failed_draws_show_where_the_error_arose(ferry_run: RunResults, tmp_path: Path) -> None:
    found = texts(opened(ferry_run, tmp_path), "Failed draws")
    assert '=IF(C9>110,1/0,"ok")' in found
    assert "Costs!D9" in found
    assert any(text.startswith("Value per share, draw ") for text in found)


def test_model_check_lists_where_differences_start_first(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    found = texts(opened(ferry_run, tmp_path), "Model check")
    assert found.index("Costs!B6") < found.index("Costs!B7")
    assert "Macros are not run." in found


def test_draws_sheet_holds_every_draw(ferry_run: RunResults, tmp_path: Path) -> None:
    sheet = opened(ferry_run, tmp_path, draws_sheet=True)["Draws"]
    rows = list(sheet.iter_rows(min_row=6, values_only=True))
    assert sheet["A1"].value == "Draws"
    assert len(rows) == 5_000
    assert [row[0] for row in rows[:3]] == [1, 2, 3]
    assert [row[2] for row in rows] == pytest.approx(ferry_run.output_draws[1].tolist(), rel=1e-14)
    failed = [row[1] for row in rows if not isinstance(row[1], float)]
    assert failed == ["#DIV/0!"] * ferry_run.failures.draws


def test_every_sheet_prints_on_a4_with_frozen_headers(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    for sheet in opened(ferry_run, tmp_path, draws_sheet=True):
        assert sheet.page_setup.paperSize == 9
        assert sheet.page_setup.fitToWidth in (None, 1)
        fitted = sheet.sheet_properties.pageSetUpPr
        assert fitted is not None
        assert fitted.fitToPage


def test_charts_have_words_for_those_who_cannot_see_them(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    opened(ferry_run, tmp_path)
    with zipfile.ZipFile(tmp_path / "run.xlsx") as package:
        drawings = [
            package.read(n).decode()
            for n in package.namelist()
            if "drawings/drawing" in n and "rels" not in n
        ]
        charts = [package.read(n).decode() for n in package.namelist() if "charts/chart" in n]
    frames = re.findall(r"<xdr:cNvPr [^>]*>", " ".join(drawings))
    assert len(frames) == len(charts) == 2 + 3 + 3 + 3
    assert all(re.search(r'descr="[^"]{30,}"', frame) for frame in frames)
    assert all(chart.count("<c:title>") >= 3 for chart in charts)


@pytest.mark.parametrize(
    "draws",
    [
        [3.5],
        [3.5] * 100,
        [0.0, 1.0] * 50,
        [encode_error(ErrorValue.NUM)] * 50,
        [np.inf, -np.inf, 1.0, 2.0],
        np.random.default_rng(1).normal(1, 0.2, 400) * 1e-12,
        np.random.default_rng(1).normal(1, 0.2, 400) * 1e15,
        np.random.default_rng(1).normal(1, 0.2, 400) * 1e300,
        1e15 + np.arange(64) / 8,
        np.random.default_rng(1).standard_cauchy(2000),
        np.full(100, 1e-300),
    ],
    ids=["one", "constant", "two", "failed", "infinite", "tiny", "large", "huge", "close", "tails", "faint"],
)  # fmt: skip
def test_any_draws_can_be_written(
    draws: Any, make_run: Made, output_record: Made, input_record: Made, tmp_path: Path
) -> None:
    finite = np.nan_to_num(np.array(draws, dtype=np.float64), nan=1.0, posinf=2.0, neginf=0.0)
    driver = input_record(
        "driver", number_format="General", base=None, base_percentile=None, mean=np.nan
    )
    output = output_record("value", 3.5, [3.5, np.inf, np.nan], number_format="General")
    book = opened(make_run([(output, draws)], [(driver, finite)]), tmp_path, draws_sheet=True)
    words = " ".join(texts(book, "Headline"))
    kept = np.array(draws)[np.isfinite(draws)]
    if len(kept) == 0:
        assert "no draw gave a number" in words
    elif len(set(kept)) == 1:
        assert "in every draw" in words
    elif len(set(kept)) == 2:
        assert "takes 2 values" in words
    else:
        assert "the central 80 % of the draws run from" in words


@pytest.mark.parametrize(
    ("base", "words"),
    [
        (4.0, "The base case is 4.00 EUR"),
        ("none yet", "no number"),
        (None, "The base case is blank"),
        (ErrorValue.REF, "The base case is the error #REF!"),
        (True, "no number"),
        (float("inf"), "no number"),
    ],
)
def test_any_base_case_can_be_written(
    base: Any, words: str, make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(4, 1, 300)
    book = opened(make_run([(output_record("value", base), draws)]), tmp_path)
    assert words in " ".join(texts(book, "Headline"))


def test_forty_outputs_fit_on_the_headline(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    rng = np.random.default_rng(1)
    results = make_run(
        [(output_record(f"output_{k}", k, [k]), rng.normal(k, 1, 300)) for k in range(40)]
    )
    book = opened(results, tmp_path)
    names = texts(book, "Headline")
    assert all(f"Output {k}" in names for k in range(40))
    assert "34 more outputs are in the table above." in names


@pytest.mark.parametrize(
    "code", ["General", "0.00", "#,##0.0,,", '0.0"x"', "[Red]-0.0;0.0", "yyyy-mm-dd", "[h]:mm", "@", "0.0.0", '"open', "[boo]0", "\x01", "0" * 300]
)  # fmt: skip
def test_number_formats_of_any_kind_leave_the_workbook_sound(
    code: str, make_run: Made, output_record: Made, input_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(45_000, 100, 300)
    results = make_run(
        [(output_record("value", 45_000.0, number_format=code), draws)],
        [(input_record("driver", number_format=code), draws)],
    )
    opened(results, tmp_path)
    assert (tmp_path / "run.xlsx").stat().st_size > 0


def test_latin_hypercube_errors_are_called_an_upper_bound(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    words = " ".join(texts(opened(ferry_run, tmp_path), "Quantiles"))
    assert "upper bound for the standard error of the mean" in words
    plain = replace(ferry_run, record=replace(ferry_run.record, sampling="random"))
    assert "upper bound" not in " ".join(texts(opened(plain, tmp_path), "Quantiles"))


def test_other_ways_of_sampling_get_no_bound(ferry_run: RunResults, tmp_path: Path) -> None:
    other = replace(ferry_run, record=replace(ferry_run.record, sampling="sobol"))
    words = " ".join(texts(opened(other, tmp_path), "Quantiles"))
    assert "upper bound" not in words
    assert "a rough guide only" in words


def test_few_values_are_named_with_their_shares(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    record = output_record("berths", 1.0, number_format="0", unit="")
    draws = [0.0] * 185 + [1.0] * 215
    words = " ".join(texts(opened(make_run([(record, draws)]), tmp_path), "Headline"))
    assert "Berths takes 2 values: 0 in 46.3 % of the draws and 1 in 53.8 %." in words


def test_sentences_round_shares_as_cells_show_them(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    # 46.25 % and 53.75 % are halves exact in binary: cells round them away from zero
    draws = np.concatenate([np.linspace(0, 1, 185), np.linspace(3, 4, 215)])
    results = make_run([(output_record("value", 2.0, [2.0]), draws)])
    words = " ".join(texts(opened(results, tmp_path), "Headline"))
    assert "46.3 % of the draws lie below it and 53.8 % above" in words
    assert "53.8 % of the draws lie above 2.00 EUR." in words


def test_shares_of_all_bins_add_up_with_the_base_bin_among_them(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    sheet = opened(ferry_run, tmp_path)["Distribution"]
    rows = []
    for row in sheet.iter_rows(min_row=10, max_col=7, values_only=True):
        if row[0] is None:
            break
        rows.append(row)
    assert sum(float(str(row[4])) for row in rows) == pytest.approx(1)
    marked = [row for row in rows if row[6] is not None]
    assert len(marked) == 1
    assert marked[0][4] == marked[0][6]
    assert float(str(marked[0][1])) <= 4.1 < float(str(marked[0][2]))


def test_a_base_case_outside_the_bins_is_told_under_the_chart(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(4, 1, 2_000)
    opened(make_run([(output_record("value", 99.0), draws)]), tmp_path)
    with zipfile.ZipFile(tmp_path / "run.xlsx") as package:
        charts = " ".join(package.read(n).decode() for n in package.namelist() if "charts/c" in n)
    assert "(base case 99.00 EUR not among them)" in charts


def test_lines_of_a_chart_differ_without_colour(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(4, 1, 2_000)
    opened(make_run([(output_record("value", 4.0, [3.0, 4.5, 5.0]), draws)]), tmp_path)
    with zipfile.ZipFile(tmp_path / "run.xlsx") as package:
        curve = package.read("xl/charts/chart1.xml").decode()
    styles = [
        re.findall(r'prstDash val="(\w+)"', series)
        for series in re.findall(r"<c:ser>.*?</c:ser>", curve, re.DOTALL)
    ]
    assert len(styles) == 5
    assert len({tuple(dashes) for dashes in styles}) == 5


@pytest.mark.parametrize("rows", [1, 5, 30])
def test_charts_of_inputs_are_not_cut_between_printed_pages(
    rows: int, make_run: Made, output_record: Made, input_record: Made, tmp_path: Path
) -> None:
    rng = np.random.default_rng(1)
    inputs = [(input_record(f"driver_{k}"), rng.normal(size=300)) for k in range(3 * rows)]
    results = make_run([(output_record("value"), rng.normal(size=300))], inputs)
    sheet = opened(results, tmp_path)["Inputs"]
    breaks = [found.id for found in sheet.row_breaks.brk]
    tops = sorted({chart.anchor._from.row for chart in sheet._charts})
    bottoms = {chart.anchor.to.row for chart in sheet._charts}
    assert len(tops) == rows
    assert not [
        b for b in breaks for top in tops if top < b <= max(x for x in bottoms if x < top + 20)
    ]
    pages = [
        len([t for t in tops if a <= t < b])
        for a, b in zip([0, *breaks], [*breaks, 9999], strict=True)
    ]
    assert max(pages) <= 2


def test_dates_outside_the_calendar_are_shown_as_numbers(
    make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    draws = np.random.default_rng(1).normal(0, 20, 300)
    record = output_record("opening_day", 5.0, number_format="yyyy-mm-dd", unit="")
    sheet = opened(make_run([(record, draws)]), tmp_path)["Quantiles"]
    cells = [row[1] for row in sheet.iter_rows(min_row=9, max_row=113, max_col=2)]
    numbers = [cell for cell in cells if isinstance(cell.value, float)]  # dates are read as dates
    assert 40 < len(numbers) < 65
    assert all(cell.value < 0 and cell.number_format == "General" for cell in numbers)
    dates = [cell for cell in cells if not isinstance(cell.value, float)]
    assert {cell.number_format for cell in dates} == {"yyyy-mm-dd"}


def test_dependent_inputs_are_named_as_people_call_them(
    ferry_run: RunResults, tmp_path: Path
) -> None:
    row = [cell.value for cell in opened(ferry_run, tmp_path)["Dependence"][6]]
    assert row[:4] == ["Passenger growth", "Fuel price", 0.4, 0.398]


@pytest.mark.parametrize(("draws", "words"), [([3.5], "1 draw"), ([3.5] * 100, "100 draws")])
def test_few_draws_are_warned_of_even_if_they_agree(
    draws: list[float], words: str, make_run: Made, output_record: Made, tmp_path: Path
) -> None:
    found = texts(opened(make_run([(output_record("value"), draws)]), tmp_path), "Headline")
    assert any(text.startswith(f"Thin precision: Value rests on {words};") for text in found)
