"""Each mistake in a side-car is answered with its line, what was read and what was expected."""

from __future__ import annotations

from pathlib import Path

import pytest

from cellsim.errors import SidecarError
from cellsim.uncertainty.sidecar import load_sidecar

GOOD = """\
[model]
workbook = "m.xlsx"

[run]
draws = 100
seed = 7
sampling = "random"

[inputs.growth]
cell = "Inputs!C6"
distribution = "normal"
mean = 0.03
sd = 0.01

[inputs.margin]
cell = "Inputs!C7"
distribution = "triangular"
low = 0.1
mode = 0.2
high = 0.3

[[dependence]]
inputs = ["growth", "margin"]
rank_correlation = 0.4

[outputs.value]
cell = "Value!D30"
thresholds = [4, 5]
"""

THIRD = """
[inputs.price]
cell = "Inputs!C8"
distribution = "uniform"
low = 1
high = 2
"""

SETS = (
    "normal takes mean and sd; or two quantiles (such as p10 and p90)",
    "triangular takes low, mode and high; or mode and two quantiles (such as p10 and p90)",
)
NUMBER = 'a number, a percentage such as "2.5%" or a formula such as "=Inputs!C6"'

# What is replaced, by what, and the problems that the result has.
MISTAKES: dict[str, tuple[str, str, list[str]]] = {
    "unknown section": (
        "[run]",
        "[runs]",
        ["line 4: unknown section 'runs'; did you mean 'run'?"],
    ),
    "unknown section far from any": (
        "[run]",
        "[zebra]",
        ["line 4: unknown section 'zebra'; known: model, run, inputs, dependence, outputs"],
    ),
    "rules": (
        "[outputs.value]",
        '[[rules]]\nformula = "=A!B1 > 0"\n[outputs.value]',
        ["line 26: the section 'rules' is not available yet"],
    ),
    "alternatives": (
        "[outputs.value]",
        '[alternatives.second]\nset = { "A!B1" = 1 }\n[outputs.value]',
        ["line 26: the section 'alternatives' is not available yet"],
    ),
    "section that is no table": (
        "[run]\ndraws = 100\nseed = 7\n",
        "[model.run]\n",
        ["line 4: unknown key 'run' in [model]; known here: as_of, iterate, workbook"],
    ),
    "no model": (
        '[model]\nworkbook = "m.xlsx"\n',
        "",
        ["the section [model] lacks the key 'workbook'"],
    ),
    "model without workbook": (
        'workbook = "m.xlsx"',
        "",
        ["line 1: the section [model] lacks the key 'workbook'"],
    ),
    "unknown key of the model": (
        'workbook = "m.xlsx"',
        'workbok = "m.xlsx"',
        [
            "line 1: the section [model] lacks the key 'workbook'",
            "line 2: unknown key 'workbok' in [model]; did you mean 'workbook'?",
        ],
    ),
    "workbook that is no text": (
        'workbook = "m.xlsx"',
        "workbook = 3",
        ["line 2: workbook must be text, read 3"],
    ),
    "as_of in quotes": (
        'workbook = "m.xlsx"',
        'workbook = "m.xlsx"\nas_of = "2026-06-30"',
        [
            (
                "line 3: as_of must be a date such as 2026-06-30 without quotes or time zone, "
                'read "2026-06-30"'
            )
        ],
    ),
    "as_of with a time zone": (
        'workbook = "m.xlsx"',
        'workbook = "m.xlsx"\nas_of = 2026-06-30T00:00:00Z',
        [
            (
                "line 3: as_of must be a date such as 2026-06-30 without quotes or time zone, "
                "read 2026-06-30 00:00:00+00:00"
            )
        ],
    ),
    "no draws": (
        "draws = 100",
        "draws = 0",
        ["line 5: draws must be a whole number from 1 to 1000000000, read 0"],
    ),
    "draws in quotes": (
        "draws = 100",
        'draws = "many"',
        ['line 5: draws must be a whole number from 1 to 1000000000, read "many"'],
    ),
    "draws as a logical": (
        "draws = 100",
        "draws = true",
        ["line 5: draws must be a whole number from 1 to 1000000000, read true"],
    ),
    "draws with a fraction": (
        "draws = 100",
        "draws = 1e5",
        ["line 5: draws must be a whole number from 1 to 1000000000, read 100000.0"],
    ),
    "negative seed": (
        "seed = 7",
        "seed = -1",
        ["line 6: seed must be a whole number from 0 to 18446744073709551615, read -1"],
    ),
    "unknown sampling": (
        '"random"',
        '"latin-hypercub"',
        [
            (
                'line 7: sampling must be "latin-hypercube" or "random", read "latin-hypercub"; '
                "did you mean 'latin-hypercube'?"
            )
        ],
    ),
    "sampling to come": (
        '"random"',
        '"sobol"',
        ['line 7: sampling "sobol" is not available yet; expected "latin-hypercube" or "random"'],
    ),
    "unknown key of the run": (
        "seed = 7",
        "sead = 7",
        ["line 6: unknown key 'sead' in [run]; did you mean 'seed'?"],
    ),
    "input without cell": (
        'cell = "Inputs!C6"\n',
        "",
        ["line 9: [inputs.growth] lacks the key 'cell'"],
    ),
    "input without distribution": (
        'distribution = "normal"\n',
        "",
        ["line 9: [inputs.growth] lacks the key 'distribution'"],
    ),
    "input that is no section": (
        "[inputs.growth]",
        "[inputs]\nfuel = 3\n[inputs.growth]",
        ["line 10: fuel must be a table, read 3"],
    ),
    "cell as a formula": (
        '"Inputs!C6"',
        '"=Inputs!C6"',
        [
            (
                'line 10: cell must be an address such as "Inputs!C6" or a name, read "=Inputs!C6"; '
                'write "Inputs!C6" without "="'
            )
        ],
    ),
    "empty cell": ('"Inputs!C6"', '" "', ['line 10: cell must be text, read " "']),
    "cell that is no text": ('"Inputs!C6"', "6", ["line 10: cell must be text, read 6"]),
    "one cell twice": (
        '"Inputs!C7"',
        '"inputs!$C$6"',
        ["line 16: cell inputs!$C$6 is already the input 'growth' (line 9)"],
    ),
    "path over cells": (
        'cell = "Inputs!C6"',
        'cells = "Inputs!C6:M6"\npath = "mean-reverting"',
        ["line 10: 'cells' in [inputs.growth]: paths over several cells are not available yet"],
    ),
    "unknown distribution": (
        '"normal"',
        '"norml"',
        ["line 11: unknown distribution \"norml\" in [inputs.growth]; did you mean 'normal'?"],
    ),
    "unknown distribution far from any": (
        '"normal"',
        '"xyz"',
        [
            (
                'line 11: unknown distribution "xyz" in [inputs.growth]; known: bernoulli, beta, '
                "discrete, lognormal, normal, pert, triangular, uniform"
            )
        ],
    ),
    "unknown key of an input": (
        "mean = 0.03",
        'mean = 0.03\ncolour = "red"',
        [
            (
                "line 13: unknown key 'colour' in [inputs.growth]; known here: cap, cell, "
                "distribution, floor, label, mean, note, replace_formula, sd, source, unit"
            )
        ],
    ),
    "misspelled parameter is reported once": (
        "mean = 0.03",
        "maen = 0.03",
        ["line 12: unknown key 'maen' in [inputs.growth]; did you mean 'mean'?"],
    ),
    "parameter of another family": (
        "sd = 0.01",
        "high = 0.01",
        [
            f"line 9: [inputs.growth]: {SETS[0]}; read mean",
            (
                "line 13: unknown key 'high' in [inputs.growth]; known here: cap, cell, "
                "distribution, floor, label, mean, note, replace_formula, sd, source, unit"
            ),
        ],
    ),
    "parameters of two sets": (
        "sd = 0.01",
        "p90 = 0.01",
        [f"line 9: [inputs.growth]: {SETS[0]}; read mean and p90"],
    ),
    "one quantile": (
        "mean = 0.03\nsd = 0.01",
        "p90 = 0.01",
        [f"line 9: [inputs.growth]: {SETS[0]}; read p90"],
    ),
    "no parameters": (
        "low = 0.1\nmode = 0.2\nhigh = 0.3",
        "",
        [f"line 15: [inputs.margin]: {SETS[1]}; read no parameters"],
    ),
    "the same quantile twice": (
        "mean = 0.03\nsd = 0.01",
        "p5 = 0.03\np05 = 0.04",
        ["line 13: [inputs.growth]: p5 and p05 are the same quantile"],
    ),
    "falling quantiles": (
        "mean = 0.03\nsd = 0.01",
        "p90 = 0.03\np10 = 0.04",
        ["line 13: [inputs.growth]: p10 must be below p90, read 0.04 and 0.03"],
    ),
    "negative standard deviation": (
        "sd = 0.01",
        "sd = -0.01",
        ["line 13: [inputs.growth]: sd must be a number above 0, read -0.01"],
    ),
    "no standard deviation, mean unknown": (
        "mean = 0.03\nsd = 0.01",
        'mean = "=A!B1"\nsd = 0',
        ["line 13: [inputs.growth]: sd must be a number above 0, read 0"],
    ),
    "low above mode": (
        "low = 0.1",
        "low = 0.25",
        ["line 18: [inputs.margin]: low must not be above mode, read 0.25 and 0.2"],
    ),
    "low above high, mode unknown": (
        "low = 0.1\nmode = 0.2",
        'low = 0.4\nmode = "=A!B1"',
        ["line 18: [inputs.margin]: low must not be above high, read 0.4 and 0.3"],
    ),
    "no width": (
        "low = 0.1\nmode = 0.2\nhigh = 0.3",
        "low = 0.2\nmode = 0.2\nhigh = 0.2",
        ["line 18: [inputs.margin]: low must be below high, read 0.2 and 0.2"],
    ),
    "mode outside its quantiles": (
        "low = 0.1\nmode = 0.2\nhigh = 0.3",
        "p10 = 0.1\nmode = 0.4\np90 = 0.3",
        ["line 19: [inputs.margin]: mode must lie between the quantiles, 0.1 and 0.3, read 0.4"],
    ),
    "number in quotes": (
        "sd = 0.01",
        'sd = "0.01"',
        [f'line 13: sd must be {NUMBER}, read "0.01"; write 0.01 without quotes'],
    ),
    "number with a decimal comma in quotes": (
        "sd = 0.01",
        'sd = "0,01"',
        [f'line 13: sd must be {NUMBER}, read "0,01"; write 0.01 without quotes'],
    ),
    "word for a number": (
        "sd = 0.01",
        'sd = "wide"',
        [f'line 13: sd must be {NUMBER}, read "wide"'],
    ),
    "empty formula": ("sd = 0.01", 'sd = "="', [f'line 13: sd must be {NUMBER}, read "="']),
    "logical for a number": (
        "sd = 0.01",
        "sd = true",
        [f"line 13: sd must be {NUMBER}, read true"],
    ),
    "infinite number": ("sd = 0.01", "sd = inf", ["line 13: sd must be a finite number, read inf"]),
    "number of many digits": (
        "sd = 0.01",
        f"sd = 1{'0' * 400}",
        ["line 13: sd must be a finite number, read a number of more than 30 digits"],
    ),
    "not a number": ("sd = 0.01", "sd = nan", ["line 13: sd must be a finite number, read nan"]),
    "list for a number": (
        "sd = 0.01",
        "sd = [1, 2]",
        ["line 13: [inputs.growth]: sd must be a number above 0, read [1, 2]"],
    ),
    "date for a number": (
        "sd = 0.01",
        "sd = 2026-01-01",
        [f"line 13: sd must be {NUMBER}, read 2026-01-01"],
    ),
    "floor above cap": (
        "sd = 0.01",
        "sd = 0.01\nfloor = 2\ncap = 1",
        ["line 14: floor must be below cap, read 2 and 1"],
    ),
    "floor that leaves nothing": (
        "high = 0.3",
        "high = 0.3\nfloor = 0.5",
        ["line 21: [inputs.margin]: floor 0.5 leaves nothing of the distribution"],
    ),
    "cap that leaves nothing": (
        "high = 0.3",
        "high = 0.3\ncap = 0.05",
        ["line 21: [inputs.margin]: cap 0.05 leaves nothing of the distribution"],
    ),
    "flag in quotes": (
        "sd = 0.01",
        'sd = 0.01\nreplace_formula = "yes"',
        ['line 14: replace_formula must be true or false, read "yes"'],
    ),
    "weights that do not sum to 1": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "discrete"\nvalues = [1, 2]\nweights = [0.5, 0.6]',
        ["line 13: [inputs.growth]: weights must be probabilities that sum to 1, read [0.5, 0.6]"],
    ),
    "negative weight": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "discrete"\nvalues = [1, 2]\nweights = [-0.5, 1.5]',
        ["line 13: [inputs.growth]: weights must be probabilities from 0 to 1, read [-0.5, 1.5]"],
    ),
    "values and weights of different length": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "discrete"\nvalues = [1, 2, 3]\nweights = [0.5, 0.5]',
        ["line 13: [inputs.growth]: values and weights must be as many, read 3 and 2"],
    ),
    "no values": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "discrete"\nvalues = []\nweights = [1]',
        ["line 12: [inputs.growth]: values must be a list of one or more finite numbers, read []"],
    ),
    "mistake inside a list": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "discrete"\nvalues = [\n 1,\n "2",\n]\nweights = [0.5, 0.5]',
        [f'line 14: values, item 2 must be {NUMBER}, read "2"; write 2 without quotes'],
    ),
    "probability above 1": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "bernoulli"\nprobability = "120%"',
        ["line 12: [inputs.growth]: probability must be a probability from 0 to 1, read 1.2"],
    ),
    "lognormal with a mean below its shift": (
        'distribution = "normal"\nmean = 0.03',
        'distribution = "lognormal"\nshift = 0.05\nmean = 0.03',
        ["line 13: [inputs.growth]: mean must be above the shift, 0.05, read 0.03"],
    ),
    "beta wider than its bounds allow": (
        'distribution = "normal"\nmean = 0.03\nsd = 0.01',
        'distribution = "beta"\nmean = 0.5\nsd = 0.5',
        ["line 13: [inputs.growth]: sd must be below 0.5 for this mean and these bounds, read 0.5"],
    ),
    "correlation beyond 1": (
        "rank_correlation = 0.4",
        "rank_correlation = 1.2",
        ["line 24: rank_correlation must be a correlation from -1 to 1, read 1.2"],
    ),
    "correlation as a formula": (
        "rank_correlation = 0.4",
        'rank_correlation = "=A!B1"',
        [
            (
                "line 24: rank_correlation must be a number; a formula is not available here yet, "
                'read "=A!B1"'
            )
        ],
    ),
    "correlation with an unknown input": (
        '["growth", "margin"]',
        '["growth", "marign"]',
        ["line 23: dependence names an unknown input 'marign'; did you mean 'margin'?"],
    ),
    "input twice in one matrix": (
        '["growth", "margin"]',
        '["growth", "growth"]',
        ["line 23: dependence names the input 'growth' twice"],
    ),
    "dependence of one input": (
        '["growth", "margin"]',
        '["growth"]',
        ["line 23: inputs must be a list of two or more inputs, read a list"],
    ),
    "dependence without correlation": (
        "rank_correlation = 0.4",
        "",
        ["line 22: [[dependence]] lacks the key 'rank_correlation'"],
    ),
    "unknown key of a dependence": (
        "rank_correlation = 0.4",
        "rank_correlation = 0.4\nrank_corelation = 0.5",
        [
            (
                "line 25: unknown key 'rank_corelation' in [[dependence]]; "
                "did you mean 'rank_correlation'?"
            )
        ],
    ),
    "dependence as a plain table": (
        "[[dependence]]",
        "[dependence]",
        ["line 22: dependence must be written as [[dependence]]"],
    ),
    "matrix of the wrong size": (
        "rank_correlation = 0.4",
        "rank_correlation = [[1, 0.4]]",
        ["line 24: rank_correlation must be a number or 2 rows of 2 numbers"],
    ),
    "matrix with a wrong diagonal": (
        "rank_correlation = 0.4",
        "rank_correlation = [[1, 0.4],\n[0.4, 0.9]]",
        ["line 25: row 2 of rank_correlation must hold 1 for the input itself, read 0.9"],
    ),
    "matrix that is not symmetric": (
        "rank_correlation = 0.4",
        "rank_correlation = [\n[1, 0.4],\n[0.5, 1]]",
        [
            (
                "line 26: rank_correlation is not symmetric: row 2, column 1 holds 0.5, "
                "the mirrored place 0.4"
            )
        ],
    ),
    "matrix whose entries contradict each other": (
        '["growth", "margin"]\nrank_correlation = 0.4',
        '["growth", "margin", "price"]\n'
        "rank_correlation = [[1, 0.9, 0.9], [0.9, 1, -0.9], [0.9, -0.9, 1]]" + THIRD,
        [
            (
                "line 24: rank_correlation is not a correlation matrix: its entries contradict each "
                "other (smallest eigenvalue -0.8, expected 0 or more)"
            )
        ],
    ),
    "matrix that no Gaussian copula reaches": (
        '["growth", "margin"]\nrank_correlation = 0.4',
        '["growth", "margin", "price"]\nrank_correlation = -0.5' + THIRD,
        [
            (
                "line 24: rank_correlation cannot be reached by a Gaussian copula (smallest "
                "eigenvalue of the normal scores' correlation -0.0353, expected 0 or more); "
                "smaller correlations can"
            )
        ],
    ),
    "sections that contradict each other": (
        '["growth", "margin"]\nrank_correlation = 0.4',
        '["growth", "margin"]\nrank_correlation = 0.9\n'
        '[[dependence]]\ninputs = ["margin", "price"]\nrank_correlation = 0.9\n'
        '[[dependence]]\ninputs = ["growth", "price"]\nrank_correlation = -0.9\n' + THIRD,
        [
            (
                "line 22: the dependence sections together: rank_correlation is not a correlation "
                "matrix: its entries contradict each other (smallest eigenvalue -0.8, expected 0 or "
                "more)"
            )
        ],
    ),
    "a pair in two sections": (
        "rank_correlation = 0.4",
        (
            "rank_correlation = 0.4\n"
            '[[dependence]]\ninputs = ["margin", "growth"]\nrank_correlation = 0.2'
        ),
        ["line 26: the pair 'growth' and 'margin' has a rank correlation already"],
    ),
    "output without cell or formula": (
        'cell = "Value!D30"',
        "",
        ["line 26: [outputs.value] must have either cell or formula, read neither"],
    ),
    "output with cell and formula": (
        'cell = "Value!D30"',
        'cell = "Value!D30"\nformula = "=Value!D30"',
        ["line 26: [outputs.value] must have either cell or formula, read both"],
    ),
    "output's formula without equals sign": (
        'cell = "Value!D30"',
        'formula = "Value!D30 * 2"',
        ['line 27: formula must begin with "=" as in "=Valuation!D30 - 1", read "Value!D30 * 2"'],
    ),
    "thresholds that are no list": (
        "[4, 5]",
        "4",
        ["line 28: thresholds must be a list such as [4.2, 5], read 4"],
    ),
    "threshold that is no number": (
        "[4, 5]",
        '[4, "high"]',
        [f'line 28: thresholds, item 2 must be {NUMBER}, read "high"'],
    ),
    "unknown key of an output": (
        "thresholds",
        "threshold",
        ["line 28: unknown key 'threshold' in [outputs.value]; did you mean 'thresholds'?"],
    ),
    "no outputs": (
        '[outputs.value]\ncell = "Value!D30"\nthresholds = [4, 5]',
        "",
        ["there are no outputs: expected a section [outputs.NAME]"],
    ),
    "an empty section of outputs": (
        '[outputs.value]\ncell = "Value!D30"\nthresholds = [4, 5]',
        "[outputs]",
        ["line 26: there are no outputs: expected a section [outputs.NAME]"],
    ),
    "broken TOML": (
        "draws = 100",
        "draws = = 100",
        ["line 5, column 9: not valid TOML: Invalid value"],
    ),
    "a key given twice": (
        "draws = 100",
        "draws = 100\ndraws = 200",
        ["line 6, column 12: not valid TOML: Cannot overwrite a value"],
    ),
}


def problems_of(folder: Path, text: str) -> list[str]:
    """The problems as a reader sees them, with the file's name left out."""
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(SidecarError) as caught:
        load_sidecar(path)
    shown = [str(problem) for problem in caught.value.problems]
    assert all(one.startswith("study.toml") for one in shown)
    return [one.removeprefix("study.toml").lstrip(",: ") for one in shown]


def test_file_without_mistakes_is_read(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_text(GOOD, encoding="utf-8")

    assert [one.name for one in load_sidecar(path).inputs] == ["growth", "margin"]


@pytest.mark.parametrize(("old", "new", "expected"), MISTAKES.values(), ids=list(MISTAKES))
def test_mistake_is_answered(tmp_path: Path, old: str, new: str, expected: list[str]) -> None:
    assert GOOD.count(old) >= 1

    assert problems_of(tmp_path, GOOD.replace(old, new, 1)) == expected


def test_all_mistakes_come_at_once_in_the_order_of_lines(tmp_path: Path) -> None:
    text = GOOD.replace("draws = 100", "draws = 0").replace("sd = 0.01", "sd = -1")
    text = text.replace("[4, 5]", '["x"]').replace("rank_correlation = 0.4", "rank_correlation = 2")

    shown = problems_of(tmp_path, text)

    assert [one.partition(":")[0] for one in shown] == ["line 5", "line 13", "line 24", "line 28"]


def test_no_inputs(tmp_path: Path) -> None:
    text = '[model]\nworkbook = "m.xlsx"\n[outputs.y]\ncell = "A!B1"\n'

    assert problems_of(tmp_path, text) == ["there are no inputs: expected a section [inputs.NAME]"]


def test_missing_file(tmp_path: Path) -> None:
    with pytest.raises(SidecarError, match="cannot be read: No such file or directory") as caught:
        load_sidecar(tmp_path / "none.toml")

    assert caught.value.problems[0].place == str(tmp_path / "none.toml")


def test_text_that_is_not_utf8(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_bytes('[model]\nworkbook = "Größe.xlsx"\n'.encode("latin-1"))

    with pytest.raises(SidecarError) as caught:
        load_sidecar(path)

    assert str(caught.value) == (
        "study.toml, line 2: byte 0xf6 is not UTF-8 text; save the file as UTF-8"
    )


ODD_VALUES = [
    "[]",
    "{}",
    '""',
    "true",
    "-1",
    "1e308",
    "[[1]]",
    "{ a = 1 }",
    "2026-01-01",
    "12:00:00",
    "[1, '=A!B1']",
]


@pytest.mark.parametrize("odd", ODD_VALUES)
def test_value_of_any_kind_anywhere_is_read_or_answered(tmp_path: Path, odd: str) -> None:
    lines = (GOOD + THIRD).splitlines()
    answered = []
    for place, line in enumerate(lines):
        key, equals, _ = line.partition(" = ")
        if not equals:
            continue
        path = tmp_path / "study.toml"
        changed = [*lines[:place], f"{key} = {odd}", *lines[place + 1 :]]
        path.write_text("\n".join(changed), encoding="utf-8")
        try:
            load_sidecar(path)
        except SidecarError as error:
            answered.append(error.problems[0].place)

    assert len(answered) > 10
    assert all(place.startswith("study.toml, line ") for place in answered)
