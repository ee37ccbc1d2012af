"""Published examples built as workbooks and run whole, within stated numerical tolerances.

Inputs of JCGM 101:2008 clause 9 as read in a public test suite; exact values recomputed in closed form.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import numpy.typing as npt
import openpyxl
import pytest

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


def test_a_dominant_rectangle_of_jcgm_101_9_2_4(tmp_path: Path) -> None:
    """One of four rectangles ten times as wide: the first-order interval of +-19.9 would be wrong."""
    narrow = 'distribution = "uniform"\nlow = -1.7320508075688772\nhigh = 1.7320508075688772'
    wide = 'distribution = "uniform"\nlow = -17.320508075688772\nhigh = 17.320508075688772'
    y = run(tmp_path, "=SUM(A1:A4)", {"a": narrow, "b": narrow, "c": narrow, "d": wide})
    close(float(y.std()), 10.148892, 10.15 / (2 * DRAWS) ** 0.5)
    close(float(np.quantile(y, 0.975)), 17.015814, quantile_error(y, 0.975))


POWER_LOSS = [
    # correlation, first mean, expected mean, sd and symmetric 95 % interval, all in 1e-6 (JCGM 101 9.4,
    # recomputed without rounding: a non-central chi-square law).
    (0.0, 0.000, 50.0, 50.0, None),
    (0.0, 0.010, 150.0, 111.80340, (8.5468, 427.1233)),
    (0.0, 0.050, 2550.0, 502.49378, (1638.48, 3603.36)),
    (0.9, 0.000, 50.0, 67.26812, (0.56, 241.22)),
    (0.9, 0.010, 150.0, 120.51971, (29.08, 478.31)),
    (0.9, 0.050, 2550.0, 504.50471, (1696.9, 3659.8)),
]


@pytest.mark.parametrize(("correlation", "x1", "mean", "sd", "interval"), POWER_LOSS)
def test_comparison_loss_of_jcgm_101_9_4(
    tmp_path: Path,
    correlation: float,
    x1: float,
    mean: float,
    sd: float,
    interval: tuple[float, float] | None,
) -> None:
    inputs = {
        "x1": f'distribution = "normal"\nmean = {x1}\nsd = 0.005',
        "x2": 'distribution = "normal"\nmean = 0\nsd = 0.005',
    }
    # a Gaussian copula with correlation r has the rank correlation 6/pi asin(r/2) (Kruskal 1958)
    spearman = 6 / np.pi * np.arcsin(correlation / 2)
    tied = f'[[dependence]]\ninputs = ["x1", "x2"]\nrank_correlation = {spearman}'
    y = run(tmp_path, "=(A1^2+A2^2)*1E6", inputs, tied if correlation else "")
    close(float(y.mean()), mean, sd / DRAWS**0.5)
    fourth = float(((y - y.mean()) ** 4).mean()) ** 0.5
    close(float(y.std()), sd, fourth / (2 * sd * DRAWS**0.5))
    if interval is None:  # the shortest interval begins at zero: [0, -50 ln 0.05]
        close(float(np.quantile(y, 0.95)), -50 * np.log(0.05), quantile_error(y, 0.95))
        return
    for probability, end in zip((0.025, 0.975), interval, strict=True):
        close(float(np.quantile(y, probability)), end, quantile_error(y, probability))


def quantile_error(draws: npt.NDArray[np.float64], probability: float) -> float:
    """Standard error of a sample quantile from the spacing of order statistics around it."""
    width = (probability * (1 - probability) / len(draws)) ** 0.5
    low, high = np.quantile(draws, [max(0.0, probability - width), min(1.0, probability + width)])
    return float(high - low) / 2


OPTIONS = [
    # formula of the pay-off on a standard normal A1; closed form (Black 1976, Haug and Hull examples from memory)
    ("=EXP(-0.1*0.5)*MAX(42*EXP((0.1-0.2^2/2)*0.5+0.2*SQRT(0.5)*A1)-40,0)", 4.759422393),
    ("=EXP(-0.1*0.5)*MAX(40-42*EXP((0.1-0.2^2/2)*0.5+0.2*SQRT(0.5)*A1),0)", 0.808599373),
    ("=EXP(-0.08*0.25)*MAX(60*EXP((0.08-0.3^2/2)*0.25+0.3*SQRT(0.25)*A1)-65,0)", 2.133368445),
    ("=EXP(-0.1*0.5)*MAX(95-100*EXP((0.1-0.05-0.2^2/2)*0.5+0.2*SQRT(0.5)*A1),0)", 2.464787647),
    ("=EXP(-0.05)*MAX(100-100*EXP(0.03+0.2*A1),0)", 5.573526022),
]


@pytest.mark.parametrize(("formula", "value"), OPTIONS)
def test_option_values_of_handbooks(tmp_path: Path, formula: str, value: float) -> None:
    y = run(tmp_path, formula, {"w": 'distribution = "normal"\nmean = 0\nsd = 1'})
    close(float(y.mean()), value, float(y.std()) / DRAWS**0.5)


def test_exchange_option_with_correlated_prices(tmp_path: Path) -> None:
    """Margrabe 1978 as tabled by Haug: S1 22, S2 20, yields 6 % and 4 %, volatilities 20 %, half a year."""
    inputs = {
        "a": 'distribution = "normal"\nmean = 0\nsd = 1',
        "b": 'distribution = "normal"\nmean = 0\nsd = 1',
    }
    formula = (
        "=MAX(22*EXP((-0.06-0.2^2/2)*0.5+0.2*SQRT(0.5)*A1)"
        "-20*EXP((-0.04-0.2^2/2)*0.5+0.2*SQRT(0.5)*A2),0)"
    )
    for correlation, value in ((0.0, 2.6496), (0.5, 2.2306)):
        spearman = 6 / np.pi * np.arcsin(correlation / 2)
        tied = f'[[dependence]]\ninputs = ["a", "b"]\nrank_correlation = {spearman}'
        y = run(tmp_path, formula, inputs, tied if correlation else "")
        close(float(y.mean()), value, float(y.std()) / DRAWS**0.5)


CLOSED_FORMS = [
    # name, formula, inputs, {probability: quantile}, mean, sd; textbook formulas, recomputed
    (
        "Gordon growth, dividend lognormal with mean 5 and variation 0.2",
        "=A1/(0.10-0.04)",
        ['distribution = "lognormal"\nmean = 5\nsd = 1'],
        {0.05: 58.997074, 0.5: 81.715056, 0.95: 113.181045},
        83.333333,
        16.666667,
    ),
    (
        "ratio of lognormals",
        "=A1/A2",
        [
            'distribution = "lognormal"\nmu = 4.605170185988092\nsigma = 0.2',
            'distribution = "lognormal"\nmu = 3.912023005428146\nsigma = 0.3',
        ],
        {0.05: 1.105266820, 0.5: 2.0, 0.95: 3.619035628},
        2.134318049,
        0.795240098,
    ),
    (
        "triangular",
        "=A1",
        ['distribution = "triangular"\nlow = 10\nmode = 20\nhigh = 40'],
        {0.1: 15.477226, 0.5: 22.679492, 0.9: 32.254033},
        23.333333,
        38.888889**0.5,
    ),
    (
        "PERT",
        "=A1",
        ['distribution = "pert"\nlow = 10\nmode = 20\nhigh = 40'],
        {0.05: 13.284972, 0.5: 21.274375, 0.95: 31.398622},
        21.666667,
        30.555556**0.5,
    ),
    (
        "sum of two uniforms",
        "=A1+A2",
        ['distribution = "uniform"\nlow = 0\nhigh = 1'] * 2,
        {0.1: 0.447213595, 0.5: 1.0, 0.9: 1.552786405},
        1.0,
        (1 / 6) ** 0.5,
    ),
]


@pytest.mark.parametrize(
    ("formula", "inputs", "quantiles", "mean", "sd"),
    [case[1:] for case in CLOSED_FORMS],
    ids=[case[0] for case in CLOSED_FORMS],
)
def test_closed_forms(
    tmp_path: Path,
    formula: str,
    inputs: list[str],
    quantiles: dict[float, float],
    mean: float,
    sd: float,
) -> None:
    y = run(tmp_path, formula, {f"x{k}": text for k, text in enumerate(inputs)})
    close(float(y.mean()), mean, sd / DRAWS**0.5)
    fourth = float(((y - y.mean()) ** 4).mean()) ** 0.5
    close(float(y.std()), sd, fourth / (2 * sd * DRAWS**0.5))
    for probability, value in quantiles.items():
        close(float(np.quantile(y, probability)), value, quantile_error(y, probability))


def test_shortest_interval_of_the_mass_calibration(tmp_path: Path) -> None:
    """JCGM 101 9.3: the shortest 95 % interval is [1.0834, 1.3825]; flat in place, so its width is tested."""
    y = np.sort(
        run(
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
    )
    inside = int(0.95 * len(y))
    widths = y[inside:] - y[:-inside]
    start = int(np.argmin(widths))
    assert abs(widths[start] - 0.2991) < 0.001
    assert abs(y[start] - 1.0834) < 0.006


def test_gauge_block_of_jcgm_101_9_5(tmp_path: Path) -> None:
    """Student, arcsine and curvilinear trapezoid inputs (6.4 of the standard), built in the workbook.

    838 nm with a standard uncertainty of 35.8 nm; symmetric 99 % interval [744.2, 931.6], recomputed.
    """
    flat = 'distribution = "uniform"\nlow = 0\nhigh = 1'
    inputs = dict.fromkeys(("t1", "t2", "t3", "t4", "arc", "c1", "c2", "c3", "c4"), flat)
    inputs["alpha"] = 'distribution = "uniform"\nlow = 9.5e-6\nhigh = 13.5e-6'
    inputs["theta"] = 'distribution = "normal"\nmean = -0.1\nsd = 0.2'
    trapezoid = "({low}-{d}+2*{d}*{r})+{s}*(-2*({low}-{d}+2*{d}*{r}))"
    d_alpha = trapezoid.format(low="-1E-6", d="1E-7", r="A6", s="A7")
    d_theta = trapezoid.format(low="-0.05", d="0.025", r="A8", s="A9")
    length = "(50000623+25*T.INV(A1,18))"
    formula = (
        f"={length}+(215+6*T.INV(A2,24))+4*T.INV(A3,5)+7*T.INV(A4,8)"
        f"-{length}*(({d_alpha})*(A11+0.5*SIN(2*PI()*A5))+A10*({d_theta}))-50000000"
    )
    y = run(tmp_path, formula.replace("T.INV", "_xlfn.T.INV"), inputs)
    close(float(y.mean()), 838.0, 35.808 / DRAWS**0.5)
    close(float(y.std()), 35.808, 35.808 / (1.9 * DRAWS) ** 0.5)
    for probability, end in ((0.005, 744.2), (0.995, 931.6)):
        assert (
            abs(float(np.quantile(y, probability)) - end)
            < 4.5 * quantile_error(y, probability) + 0.1
        )
