"""Uncertainty in ordinary workbooks: recalculated exactly, drawn, evaluated, reported."""

from cellsim.api import Model, Result, Study, load, open_study
from cellsim.errors import (
    CellsimError,
    CircularReferenceError,
    FormulaSyntaxError,
    ModelError,
    Problem,
    RunError,
    SidecarError,
    UsageError,
)
from cellsim.values import ErrorValue
from cellsim.version import VERSION

__version__ = VERSION

__all__ = [
    "CellsimError",
    "CircularReferenceError",
    "ErrorValue",
    "FormulaSyntaxError",
    "Model",
    "ModelError",
    "Problem",
    "Result",
    "RunError",
    "SidecarError",
    "Study",
    "UsageError",
    "__version__",
    "load",
    "open_study",
]
