"""The registry: a spreadsheet function is one decorated kernel, and its signature says everything else.

A kernel's annotations are the argument kinds below. They say how an argument is evaluated and
coerced before the kernel sees it, so that a kernel holds nothing but its own arithmetic:

| annotation | the kernel gets | arrays and ranges |
| --- | --- | --- |
| `Number`, `Whole` | float, or int truncated toward zero | element by element |
| `Text`, `Logical` | str, bool | element by element |
| `ComplexNumber` | Complex: a number with the letter of its imaginary unit | element by element |
| `ScalarValue` | a value that is no error, uncoerced | element by element |
| `AnyScalar` | a value that may be an error | element by element |
| `NumberItems` | list of floats, by the rule of SUM | numbers in them count, all else is passed over |
| `Values` | Array | as they are; errors inside are not looked at |
| `ArrayValues` | Array, and operators inside work on whole ranges | as `Values` |
| `Matrix` | NumPy array (rows, columns) of numbers, else #VALUE! | whole, operators likewise |
| `Operand` | scalar, error, Array or Reference, uncoerced | as they are |
| `ArrayOperand` | as `Operand`, and operators inside work on whole ranges | as they are |
| `CellArea` | Reference, else #VALUE! | as they are |
| `Lazy` | a function without arguments that gives the Value | evaluated when called |
| `Function` | LambdaValue, else #VALUE! | - |

A default makes a parameter optional, `*parameter` takes any number. A first parameter annotated
`Context` gets the surroundings of the formula. Raise `Fault(ErrorValue.NUM)` or return an
`ErrorValue` for a spreadsheet error. A result that is not finite becomes #NUM!.
"""

from __future__ import annotations

import datetime as dt
import enum
import inspect
import typing
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Annotated, Any, Protocol, TypeAlias, TypeVar

import numpy as np
import numpy.typing as npt

from cellsim.cells import CellRef, RangeRef
from cellsim.functions.complex_text import Complex
from cellsim.values import Array, LambdaValue, Reference, Scalar, Value


class ArgumentKind(enum.Enum):
    """How an argument reaches the kernel; the module's text has the table."""

    NUMBER = "number"
    WHOLE = "whole"
    TEXT = "text"
    LOGICAL = "logical"
    COMPLEX = "complex"
    SCALAR = "scalar"
    ANY_SCALAR = "any scalar"
    NUMBER_ITEMS = "number items"
    VALUES = "values"
    ARRAY_VALUES = "array values"
    MATRIX = "matrix"
    OPERAND = "operand"
    ARRAY_OPERAND = "array operand"
    CELL_AREA = "cell area"
    LAZY = "lazy"
    FUNCTION = "function"


LIFTED = frozenset(
    {
        ArgumentKind.NUMBER,
        ArgumentKind.WHOLE,
        ArgumentKind.TEXT,
        ArgumentKind.LOGICAL,
        ArgumentKind.COMPLEX,
        ArgumentKind.SCALAR,
        ArgumentKind.ANY_SCALAR,
    }
)
"""Kinds for which arrays are taken element by element."""

WHOLE_ARRAY = frozenset(
    {ArgumentKind.ARRAY_VALUES, ArgumentKind.ARRAY_OPERAND, ArgumentKind.MATRIX}
)
"""Kinds inside which operators and functions work on whole ranges even in a plain formula."""

Number = Annotated[float, ArgumentKind.NUMBER]
Whole = Annotated[int, ArgumentKind.WHOLE]
Text = Annotated[str, ArgumentKind.TEXT]
Logical = Annotated[bool, ArgumentKind.LOGICAL]
ComplexNumber = Annotated[Complex, ArgumentKind.COMPLEX]
ScalarValue = Annotated[float | str | bool | None, ArgumentKind.SCALAR]
AnyScalar = Annotated[Scalar, ArgumentKind.ANY_SCALAR]
NumberItems = Annotated[list[float], ArgumentKind.NUMBER_ITEMS]
Values = Annotated[Array, ArgumentKind.VALUES]
ArrayValues = Annotated[Array, ArgumentKind.ARRAY_VALUES]
Matrix = Annotated[npt.NDArray[np.float64], ArgumentKind.MATRIX]
Operand = Annotated[Value, ArgumentKind.OPERAND]
ArrayOperand = Annotated[Value, ArgumentKind.ARRAY_OPERAND]
CellArea = Annotated[Reference, ArgumentKind.CELL_AREA]
Lazy = Annotated[Callable[[], Value], ArgumentKind.LAZY]
Function = Annotated[LambdaValue, ArgumentKind.FUNCTION]


class Context(Protocol):
    """What surrounds a formula: its cell, the workbook's cells and settings."""

    @property
    def cell(self) -> CellRef:
        """The cell whose formula is evaluated."""

    @property
    def date_1904(self) -> bool:
        """Whether serial number 0 is 1 January 1904."""

    @property
    def character_set(self) -> str:
        """The Python name of the character set of CHAR and CODE: that of the file's program."""

    @property
    def now(self) -> dt.datetime:
        """What NOW() returns; its date is TODAY()."""

    def cell_value(self, sheet: str, row: int, column: int) -> Scalar:
        """The value of one cell."""

    def area_values(self, area: RangeRef) -> Array:
        """The values of a rectangle; a whole column or row ends where the workbook's cells end."""

    def intersect(self, reference: Reference) -> Scalar:
        """Implicit intersection with the formula's row or column; #VALUE! where there is none."""

    def parse_reference(self, text: str) -> Value:
        """The reference, name or table that a text in A1 notation names; #REF! if none."""

    def formula_text(self, sheet: str, row: int, column: int) -> str | None:
        """The formula of a cell with its `=`, None if it holds none."""

    def number_format(self, sheet: str, row: int, column: int) -> str:
        """The number format code of a cell."""

    def row_hidden(self, sheet: str, row: int) -> bool:
        """Whether a row is hidden by hand or by a filter."""

    def row_filtered(self, sheet: str, row: int) -> bool:
        """Whether a row is hidden by a filter."""

    def holds_subtotal(self, sheet: str, row: int, column: int) -> bool:
        """Whether a cell's formula calls SUBTOTAL or AGGREGATE, which others of them pass over."""

    def sheet_titles(self) -> Sequence[str]:
        """The titles of all sheets in order."""

    def random(self) -> float:
        """The next number in [0, 1) of the formula's own fixed stream."""


@dataclass(frozen=True, slots=True)
class ParameterRecord:
    """One parameter of a function.

    Attributes:
        name: Its name in the kernel.
        kind: How the argument reaches the kernel.
        variadic: Whether it takes any number of arguments.
    """

    name: str
    kind: ArgumentKind
    variadic: bool


@dataclass(frozen=True, slots=True)
class FunctionRecord:
    """A spreadsheet function.

    Attributes:
        name: Its name in formulas, in upper case, without prefixes.
        kernel: The Python function that computes it for one draw.
        parameters: Its parameters, the context left out.
        least: The fewest arguments.
        most: The most arguments.
        takes_context: Whether the kernel's first parameter is the context.
        volatile: Whether its value may change without a change of its arguments.
        gives_reference: Whether it may return a reference (OFFSET, INDEX and their like).
        group: For a variadic parameter whose arguments come in groups: the kinds within a group.
        strict: Whether single values may be neither logicals nor ranges of several cells (#VALUE!).
        scalars_first: Whether errors of single values come before errors inside ranges.
        result: "number", "text" or "logical" where the kernel's annotation says so, else "any".
        documentation: The first line of the kernel's docstring.
        module: The family module that declares it.
    """

    name: str
    kernel: Callable[..., Any]
    parameters: tuple[ParameterRecord, ...]
    least: int
    most: int
    takes_context: bool
    volatile: bool
    gives_reference: bool
    group: tuple[ArgumentKind, ...]
    strict: bool
    scalars_first: bool
    result: str
    documentation: str
    module: str

    def parameter(self, position: int) -> ParameterRecord:
        """The parameter that takes the argument at a position counted from 0."""
        last = len(self.parameters) - 1
        parameter = self.parameters[min(position, last)]
        if not self.group or position < last:
            return parameter
        kind = self.group[(position - last) % len(self.group)]
        return replace(parameter, kind=kind)


MAC_ROMAN = "mac_roman"
"""The character set of spreadsheet programs on the Macintosh; elsewhere it is Windows-1252."""

FloatArray: TypeAlias = npt.NDArray[np.float64]
DrawsKernel: TypeAlias = Callable[..., FloatArray | None]

_FUNCTIONS: dict[str, FunctionRecord] = {}
_OVER_DRAWS: dict[str, DrawsKernel] = {}
_PICKING: set[str] = set()
_MOST_ARGUMENTS = 255
_RESULTS: dict[object, str] = {float: "number", int: "number", str: "text", bool: "logical"}

Kernel = TypeVar("Kernel", bound=Callable[..., Any])
AnyDrawsKernel = TypeVar("AnyDrawsKernel", bound=DrawsKernel)


def spreadsheet_function(
    *names: str,
    volatile: bool = False,
    gives_reference: bool = False,
    group: tuple[ArgumentKind, ...] = (),
    strict: bool = False,
    scalars_first: bool = False,
    least: int | None = None,
    most: int | None = None,
) -> Callable[[Kernel], Kernel]:
    """Register a kernel under one or more names (aliases such as STDEV and STDEV.S).

    Args:
        names: Names in upper case.
        volatile: The value may change without a change of its arguments.
        gives_reference: The kernel may return a Reference.
        group: The kinds in which arguments of the variadic parameter come in turn, such as a range and
            a criterion; without it all are of the kind of its annotation.
        strict: Arguments in places for single values may be neither logicals nor ranges of several
            cells (#VALUE!), as in the functions that spreadsheet programs long kept in an add-in.
        scalars_first: Single values are looked at before ranges, so that their errors come first.
        least: Fewest arguments, where the signature does not say it.
        most: Most arguments, where the signature does not say it.

    Raises:
        ValueError: A name is registered twice, or a parameter has no argument kind.
    """

    def register(kernel: Kernel) -> Kernel:
        parameters, required, takes_context, result = _read_signature(kernel)
        unlimited = any(parameter.variadic for parameter in parameters)
        for name in names:
            if name in _FUNCTIONS:
                raise ValueError(f"{name} is registered twice")
            _FUNCTIONS[name] = FunctionRecord(
                name=name,
                kernel=kernel,
                parameters=parameters,
                least=required if least is None else least,
                most=most
                if most is not None
                else _MOST_ARGUMENTS
                if unlimited
                else len(parameters),
                takes_context=takes_context,
                volatile=volatile,
                gives_reference=gives_reference,
                group=group,
                strict=strict,
                scalars_first=scalars_first,
                result=result,
                documentation=(inspect.getdoc(kernel) or "").split("\n")[0],
                module=kernel.__module__.rpartition(".")[2],
            )
        return kernel

    return register


def over_draws(
    *names: str, picks_items: bool = False
) -> Callable[[AnyDrawsKernel], AnyDrawsKernel]:
    """Register the form of a function that works on all draws of a block at once.

    It takes the same arguments as the kernel does. `Number` and `Whole` arguments are float arrays
    of shape (draws,) or plain floats (`Whole` ones not yet truncated), `Logical` ones the same
    holding 0 and 1, each `NumberItems` argument a float array of shape (items, draws), each
    `Values`, `ArrayValues` or `Matrix` argument a `Stack`. It returns float64 of shape (draws,);
    a spreadsheet error is `encode_error(...)` in its draw. Where an argument is a NaN (an error
    already), the result of that draw does not matter: the error is put there afterwards, but the
    kernel must neither raise nor hang on it. Arguments must not be written to. A kernel may return
    None to say that it cannot serve these arguments: they are then taken draw by draw. A keyword
    parameter `date_1904` gets the workbook's date system.

    Args:
        names: The functions.
        picks_items: Whether it finds or picks items of its `Stack` arguments, so that an error in an
            item that is not picked does not matter; the kernel answers for errors inside stacks itself.

    Raises:
        ValueError: A name is registered twice.
    """

    def register(kernel: AnyDrawsKernel) -> AnyDrawsKernel:
        for name in names:
            if name in _OVER_DRAWS:
                raise ValueError(f"{name} has two kernels over draws")
            _OVER_DRAWS[name] = kernel
            if picks_items:
                _PICKING.add(name)
        return kernel

    return register


@dataclass(frozen=True, slots=True)
class Stack:
    """A rectangle of numbers over draws.

    Attributes:
        rows: Number of rows.
        columns: Number of columns.
        data: Shape (rows * columns, draws), row by row.
    """

    rows: int
    columns: int
    data: FloatArray


def find_function(name: str) -> FunctionRecord | None:
    """The function of that name in upper case, or None."""
    return _FUNCTIONS.get(name)


def find_over_draws(name: str) -> DrawsKernel | None:
    """The kernel over draws of that name, or None."""
    return _OVER_DRAWS.get(name)


def picks_items(name: str) -> bool:
    """Whether the kernel over draws of that name answers for errors inside its stacks itself."""
    return name in _PICKING


def all_functions() -> dict[str, FunctionRecord]:
    """Every registered function by name."""
    return dict(_FUNCTIONS)


def all_over_draws() -> dict[str, DrawsKernel]:
    """Every kernel over draws by name."""
    return dict(_OVER_DRAWS)


def _read_signature(
    kernel: Callable[..., Any],
) -> tuple[tuple[ParameterRecord, ...], int, bool, str]:
    hints = typing.get_type_hints(kernel, include_extras=True)
    parameters: list[ParameterRecord] = []
    required = 0
    takes_context = False
    for name, parameter in inspect.signature(kernel).parameters.items():
        hint = hints.get(name)
        if hint is Context:
            takes_context = True
            continue
        variadic = parameter.kind is inspect.Parameter.VAR_POSITIONAL
        parameters.append(ParameterRecord(name, _kind_of(kernel, name, hint), variadic))
        required += parameter.default is inspect.Parameter.empty and not variadic
    return tuple(parameters), required, takes_context, _RESULTS.get(hints.get("return"), "any")


def _kind_of(kernel: Callable[..., Any], name: str, hint: object) -> ArgumentKind:
    candidates = [hint, *typing.get_args(hint)]  # `Number | None` for an optional one
    for candidate in candidates:
        for mark in getattr(candidate, "__metadata__", ()):
            if isinstance(mark, ArgumentKind):
                return mark
    raise ValueError(f"parameter {name} of {kernel.__qualname__} has no argument kind")
