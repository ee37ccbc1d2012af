"""The outcome of a run, as the Python API gives it."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from pathlib import Path

import numpy as np
import pandas as pd

from cellsim.errors import Problem, UsageError
from cellsim.report.write import write_report
from cellsim.results import RunResults


class Result:
    """The outcome of a run.

    Attributes:
        records: Everything that the run left behind.
    """

    def __init__(self, records: RunResults) -> None:
        self.records = records

    @cached_property
    def outputs(self) -> pd.DataFrame:
        """One row a draw, one column an output; NaN in failed draws."""
        names = [record.name for record in self.records.outputs]
        return pd.DataFrame(self.records.output_draws.T, columns=names, copy=False)

    @cached_property
    def inputs(self) -> pd.DataFrame:
        """One row a draw, one column an input."""
        names = [record.name for record in self.records.inputs]
        return pd.DataFrame(self.records.input_draws.T, columns=names, copy=False)

    @property
    def failed_draws(self) -> int:
        """Number of draws in which at least one output failed."""
        return self.records.failures.draws

    def quantiles(self, probabilities: Sequence[float]) -> pd.DataFrame:
        """Quantiles of every output, failed draws left out.

        Args:
            probabilities: Numbers from 0 to 1.

        Returns:
            One row a probability, one column an output; linear interpolation between order
            statistics (Hyndman and Fan 1996, type 7).

        Raises:
            UsageError: A probability is not between 0 and 1.
        """
        wrong = [p for p in probabilities if not 0 <= p <= 1]
        if wrong:
            raise UsageError(
                Problem("probabilities", f"expected numbers from 0 to 1, got {wrong[0]}")
            )
        columns = {}
        for record, values in zip(self.records.outputs, self.records.output_draws, strict=True):
            kept = values[np.isfinite(values)]
            columns[record.name] = (
                np.quantile(kept, probabilities)
                if len(kept)
                else np.full(len(probabilities), np.nan)
            )
        return pd.DataFrame(columns, index=pd.Index(probabilities, name="probability"))

    def write(
        self, path: Path | str, *, overwrite: bool = False, draws_sheet: bool = False
    ) -> None:
        """Write the results workbook.

        Args:
            path: The new .xlsx file; it appears whole or not at all.
            overwrite: Whether an existing file is replaced.
            draws_sheet: Whether every draw is written too.

        Raises:
            RunError: The file exists, or its folder cannot be written to.
        """
        write_report(self.records, Path(path), overwrite=overwrite, draws_sheet=draws_sheet)
