"""Where the stages are wired together: models, studies, results."""

from cellsim.api.model import Model, load
from cellsim.api.result import Result
from cellsim.api.study import Study, open_study

__all__ = ["Model", "Result", "Study", "load", "open_study"]
