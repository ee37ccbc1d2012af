"""Published examples built as workbooks and run whole, within stated numerical tolerances.

Inputs of JCGM 101:2008 clause 9 as read in a public test suite; exact values recomputed in closed form.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import numpy.typing as npt
import openpyxl

import cellsim

DRAWS = 200_000


def run(
    folder: Path, formula: str, inputs: dict[str, str], extra: str = ""
) -> npt.NDArray[np.float64]:
    book = openpyxl.Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "M"
    lines = [
        '[model]\nworkbook = "m.xlsx"',
        f'[run]\ndraws = {DRAWS}\nseed = 1\nsampling = "random"',
    ]
    for row, (name, text) in enumerate(inputs.items(), start=1):
        sheet.cell(row, 1, 1.0)
        lines.append(f'[inputs.{name}]\ncell = "M!A{row}"\n{text}')
    sheet["C1"] = formula
    book.save(folder / "m.xlsx")
    lines += [extra, '[outputs.y]\ncell = "M!C1"']
    (folder / "m.toml").write_text("\n\n".join(lines))
    draws: npt.NDArray[np.float64] = (
        cellsim.open_study(folder / "m.toml").run().records.output_draws[0]
    )
    return draws


def close(found: float, wanted: float, error: float) -> None:
    assert abs(found - wanted) < 4.5 * error, f"{found} for {wanted}"


def test_sum_of_four_normals_of_jcgm_101_9_2_2(tmp_path: Path) -> None:
    y = run(
        tmp_path,
        "=SUM(A1:A4)",
        {f"x{k}": 'distribution = "normal"\nmean = 0\nsd = 1' for k in range(4)},
    )
    close(float(y.mean()), 0.0, 2 / DRAWS**0.5)
    close(float(y.std()), 2.0, 2 / (2 * DRAWS) ** 0.5)
    close(float(np.quantile(y, 0.975)), 3.919928, 2 * 0.0067 / (DRAWS / 125_000) ** 0.5)


def test_sum_of_four_rectangles_of_jcgm_101_9_2_3(tmp_path: Path) -> None:
    text = 'distribution = "uniform"\nlow = -1.7320508075688772\nhigh = 1.7320508075688772'
    y = run(tmp_path, "=SUM(A1:A4)", {f"x{k}": text for k in range(4)})
    close(float(np.quantile(y, 0.975)), 3.8794067, 0.008)


def test_mass_calibration_of_jcgm_101_9_3(tmp_path: Path) -> None:
    y = run(
        tmp_path,
        "=(A1+A2)*(1+(A3-1.2)*(1/A4-1/A5))-100000",
        {
            "rc": 'distribution = "normal"\nmean = 100000\nsd = 0.05',
            "dm": 'distribution = "normal"\nmean = 1.234\nsd = 0.02',
            "air": 'distribution = "uniform"\nlow = 1.1\nhigh = 1.3',
            "w": 'distribution = "uniform"\nlow = 7000\nhigh = 9000',
            "r": 'distribution = "uniform"\nlow = 7950\nhigh = 8050',
        },
    )
    close(float(y.mean()), 1.2340, 0.0755 / DRAWS**0.5)
    close(float(y.std()), 0.07547974, 0.0755 / (2 * DRAWS) ** 0.5)
    close(float(np.quantile(y, 0.025)), 1.08443, 0.0005)


def test_lognormal_product_with_and_without_copula(tmp_path: Path) -> None:
    inputs = {
        "x": 'distribution = "lognormal"\nmu = 4.605170185988092\nsigma = 0.2',
        "z": 'distribution = "lognormal"\nmu = 3.912023005428146\nsigma = 0.3',
    }
    y = run(tmp_path, "=A1*A2", inputs)
    sd = float(y.std())
    close(float(y.mean()), 5335.795122, sd / DRAWS**0.5)
    close(float(np.median(y)), 5000.0, 1.2533 * sd / DRAWS**0.5)
    spearman = 6 / np.pi * np.arcsin(0.25)
    tied = f'[[dependence]]\ninputs = ["x", "z"]\nrank_correlation = {spearman}'
    both = run(tmp_path, "=A1*A2", inputs, tied)
    close(float(both.mean()), 5498.294276, float(both.std()) / DRAWS**0.5)


def test_option_value_by_simulation_against_the_closed_form(tmp_path: Path) -> None:
    """Common case S = K = 100, r 5 %, volatility 20 %, one year: 10.450583572 (Black and Scholes 1973)."""
    y = run(
        tmp_path,
        "=EXP(-0.05)*MAX(100*EXP(0.03+0.2*A1)-100,0)",
        {"w": 'distribution = "normal"\nmean = 0\nsd = 1'},
    )
    close(float(y.mean()), 10.450583572, float(y.std()) / DRAWS**0.5)
