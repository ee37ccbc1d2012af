"""A staged development valued by its success flags: the mean over draws is the risk-adjusted value.

The expectation over the stages' outcomes is the sum over the ways in which development can end, chance
times value (law of total expectation, any textbook of probability). It is worked out here from the
values that LibreOffice stored in the sample, not from anything that cellsim calculated.
"""

from __future__ import annotations

import shutil
from pathlib import Path

import numpy as np
import openpyxl
import pandas as pd
import pytest

import cellsim
from cellsim.errors import SidecarError

SAMPLE = Path(__file__).resolve().parents[2] / "sample_workbooks" / "ottermoor_therapeutics.xlsx"
DRAWS = 40_000
STAGES = 5
FIRST_STAGE = 8
"""Row of the first stage on Development; its flag is in row 31 of Inputs."""
FIRST_FLAG = 31

pytestmark = pytest.mark.slow


def _stored(sheet: str) -> openpyxl.worksheet.worksheet.Worksheet:
    return openpyxl.load_workbook(SAMPLE, data_only=True)[sheet]


def _ends() -> tuple[np.ndarray, np.ndarray]:
    """Chance and present value of each way to end: a stage fails, in their order, or the launch.

    Costs, milestones and flows are the stored rows by year; chances are the typed-in inputs.
    """
    development, valuation = _stored("Development"), _stored("Valuation")
    chances = np.array([_stored("Inputs")[f"C{26 + n}"].value for n in range(STAGES)])
    rate = _stored("Inputs")["C7"].value
    factors = (1 + rate) ** -(np.arange(25) + 0.5)

    def by_year(sheet: openpyxl.worksheet.worksheet.Worksheet, row: int) -> np.ndarray:
        return np.array([sheet.cell(row, 4 + year).value for year in range(25)], dtype=float)

    costs = [by_year(development, 22 + n) @ factors for n in range(STAGES)]
    dues = [
        development[f"N{FIRST_STAGE + n}"].value
        * factors[development[f"I{FIRST_STAGE + n}"].value.year - 2026]
        for n in range(STAGES)
    ]
    reached = np.cumprod([1.0, *chances])
    outlays = [-sum(costs[: n + 1]) - sum(dues[:n]) for n in range(STAGES)]
    launched = by_year(valuation, 12) @ factors - sum(costs) - sum(dues)
    return (
        np.array([*(reached[:-1] * (1 - chances)), reached[-1]]),
        np.array([*outlays, launched]),
    )


def _study(
    model: Path, outputs: str, *, draws: int = DRAWS, sampling: str = "random"
) -> cellsim.Study:
    """A study in which only the five flags are drawn."""
    flags = "".join(
        f'[inputs.stage_{n}]\ncell = "Inputs!C{FIRST_FLAG + n}"\ndistribution = "bernoulli"\n'
        f'probability = "=Development!E{FIRST_STAGE + n}"\n'
        for n in range(STAGES)
    )
    sidecar = model.with_name("flags.toml")
    sidecar.write_text(
        f'[model]\nworkbook = "{model.name}"\n'
        f'[run]\ndraws = {draws}\nseed = 4711\nsampling = "{sampling}"\n{flags}{outputs}'
    )
    return cellsim.open_study(sidecar)


def _draw(folder: Path, sampling: str) -> pd.DataFrame:
    outputs = (
        '[outputs.value]\ncell = "Results!C6"\n'
        '[outputs.launched]\nformula = "=Results!C10"\n'
        f'[outputs.stages_done]\nformula = "=SUM(Development!M{FIRST_STAGE}:M{FIRST_STAGE + 4})"\n'
    )
    model = Path(shutil.copy(SAMPLE, folder))
    return _study(model, outputs, sampling=sampling).run().outputs


@pytest.fixture(scope="module", params=["random", "latin-hypercube"])
def drawn(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> pd.DataFrame:
    return _draw(tmp_path_factory.mktemp("staged"), request.param)


def test_chances_of_the_ends_add_up_and_give_the_stored_risk_adjusted_value() -> None:
    chances, values = _ends()
    assert chances.sum() == pytest.approx(1, abs=1e-12)
    assert chances @ values == pytest.approx(_stored("Results")["C5"].value, rel=1e-9)


def test_mean_over_drawn_flags_is_the_risk_adjusted_value(drawn: pd.DataFrame) -> None:
    """Within three standard errors."""
    chances, values = _ends()
    mean = chances @ values
    error = np.sqrt(chances @ (values - mean) ** 2 / DRAWS)
    assert drawn["value"].mean() == pytest.approx(mean, abs=3 * error)
    assert cellsim.load(SAMPLE).calculate()["Results!C5"] == pytest.approx(mean, rel=1e-9)


def test_spread_over_drawn_flags_is_that_of_the_ends(drawn: pd.DataFrame) -> None:
    """The standard error of a sample variance is sqrt((m4 - m2^2) / n) (any textbook)."""
    chances, values = _ends()
    deviations = values - chances @ values
    variance, fourth = chances @ deviations**2, chances @ deviations**4
    error = np.sqrt((fourth - variance**2) / DRAWS)
    assert drawn["value"].var() == pytest.approx(variance, abs=3 * error)
    assert _stored("Results")["C8"].value == pytest.approx(np.sqrt(variance), rel=1e-9)


def test_each_end_comes_about_as_often_as_its_chance_and_has_its_value(drawn: pd.DataFrame) -> None:
    chances, values = _ends()
    for done, (chance, value) in enumerate(zip(chances, values, strict=True)):
        ending = drawn.loc[drawn["stages_done"] == done, "value"]
        assert len(ending) / DRAWS == pytest.approx(
            chance, abs=4 * np.sqrt(chance * (1 - chance) / DRAWS)
        )
        np.testing.assert_allclose(ending, value, rtol=1e-9)
    launched = drawn["launched"] == 1
    assert (launched == (drawn["stages_done"] == STAGES)).all()


def test_the_risk_adjusted_value_does_not_depend_on_the_flags(tmp_path: Path) -> None:
    model = Path(shutil.copy(SAMPLE, tmp_path))
    with pytest.raises(SidecarError, match="does not depend on any input"):
        _study(model, '[outputs.value]\ncell = "Results!C5"\n')


def test_chances_are_read_from_the_model(tmp_path: Path) -> None:
    """A stage made certain in the model's own inputs is certain among the draws."""
    book = openpyxl.load_workbook(SAMPLE)
    for n in range(STAGES):
        book["Inputs"][f"C{26 + n}"] = 1 if n < STAGES - 1 else 0
    model = tmp_path / "certain.xlsx"
    book.save(model)
    outputs = _study(model, '[outputs.value]\ncell = "Results!C6"\n', draws=500).run().outputs
    np.testing.assert_allclose(outputs["value"], _ends()[1][STAGES - 1], rtol=1e-9)
