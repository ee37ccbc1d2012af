"""Emitting operators and coercions on lowered values, with constants folded on the way."""

from __future__ import annotations

from cellsim.functions.coercion import to_logical, to_number
from cellsim.functions.operators import binary_scalar
from cellsim.program.ir import (
    Builder,
    Constant,
    Kind,
    MixedChoice,
    Op,
    Operand,
    Part,
    Register,
    constant,
)
from cellsim.program.lowered import (
    Block,
    Choice,
    Flagged,
    Known,
    Lowered,
    Numeric,
    UnlowerableError,
    Varied,
)
from cellsim.values import (
    ErrorValue,
    Fault,
    LambdaValue,
    Reference,
    Scalar,
    decode_error,
    encode_error,
)

ARITHMETIC_OPS = {
    "+": Op.ADD,
    "-": Op.SUBTRACT,
    "*": Op.MULTIPLY,
    "/": Op.DIVIDE,
    "^": Op.POWER,
}
COMPARISON_OPS = {
    "=": Op.EQUAL,
    "<>": Op.NOT_EQUAL,
    "<": Op.LESS,
    "<=": Op.LESS_EQUAL,
    ">": Op.GREATER,
    ">=": Op.GREATER_EQUAL,
}
_LARGEST_UNROLLED_POWER = 64
_DEEPEST_CHOICE = 6
_NUMBER, _TEXT, _LOGICAL = range(3)


class Emitter:
    """Emits operators and coercions into a builder."""

    def __init__(self, builder: Builder, *, date_1904: bool) -> None:
        self.builder = builder
        self.date_1904 = date_1904

    def number(self, value: Lowered) -> Operand:
        """The operand that holds a value as a number, coerced as an operator does.

        Raises:
            UnlowerableError: It is an array.
        """
        if isinstance(value, Numeric):
            return value.operand
        if isinstance(value, Known):
            return self._known_number(value)
        if isinstance(value, Flagged):
            return self.builder.emit(Op.AS_NUMBER, value.operand)
        if isinstance(value, Choice):
            then, otherwise = self.number(value.then), self.number(value.otherwise)
            return self.builder.emit(Op.SELECT, value.flag, then, otherwise)
        if isinstance(value, Varied):
            return self.builder.emit(Op.TO_NUMBER, value.operand)
        raise UnlowerableError("an array stands where a single value is wanted")

    def _known_number(self, value: Known) -> Constant:
        if isinstance(value.value, (Reference, LambdaValue)):
            raise UnlowerableError("a reference stands where a single value is wanted")
        try:
            return constant(to_number(value.value, date_1904=self.date_1904))
        except Fault as fault:
            return constant(encode_error(fault.error))

    def flag(self, value: Lowered) -> Operand:
        """The operand that holds a value as a logical; a constant is 1.0, 0.0 or an error.

        Raises:
            UnlowerableError: It is an array or may be text.
        """
        if isinstance(value, Flagged):
            return value.operand
        if isinstance(value, Numeric):
            return self.builder.emit(Op.IS_TRUE, self.settled(value))
        if isinstance(value, Known):
            if isinstance(value.value, (Reference, LambdaValue)):
                raise UnlowerableError("a reference stands where a single value is wanted")
            try:
                return constant(float(to_logical(value.value)))
            except Fault as fault:
                return constant(encode_error(fault.error))
        if isinstance(value, Choice):
            then, otherwise = self.flag(value.then), self.flag(value.otherwise)
            return self.builder.emit(Op.SELECT_FLAG, value.flag, then, otherwise)
        raise UnlowerableError("text or an array stands where a logical is wanted")

    def settled(self, value: Numeric) -> Operand:
        """The number of a value, zero where its last sum or difference cancels."""
        if value.cancels_against is None:
            return value.operand
        return self.builder.emit(Op.CANCEL, value.operand, value.cancels_against)

    def exact_number(self, value: Lowered) -> Operand:
        """As `number`, settled: for operations in which a tiny number makes a difference."""
        return self.settled(value) if isinstance(value, Numeric) else self.number(value)

    def as_lowered(self, operand: Operand) -> Lowered:
        """A number operand as a lowered value."""
        if isinstance(operand, Constant):
            return Known(constant_value(operand))
        return Numeric(operand)

    def arithmetic(self, operator: str, left: Lowered, right: Lowered) -> Lowered:
        """An arithmetic operator on single values."""
        if isinstance(left, Known) and isinstance(right, Known):
            return self._fold(operator, left, right)
        first = self.exact_number(left) if operator == "^" else self.number(left)
        second = self.exact_number(right) if operator in {"/", "^"} else self.number(right)
        return self.as_lowered(self.arithmetic_operands(operator, first, second))

    def _fold(self, operator: str, left: Known, right: Known) -> Known:
        a, b = left.value, right.value
        if isinstance(a, (Reference, LambdaValue)) or isinstance(b, (Reference, LambdaValue)):
            raise UnlowerableError("a reference stands where a single value is wanted")
        return Known(binary_scalar(operator, a, b, date_1904=self.date_1904))

    def arithmetic_operands(self, operator: str, left: Operand, right: Operand) -> Operand:
        """An arithmetic operator on number operands."""
        if isinstance(left, Constant):
            if isinstance(right, Constant):
                a, b = constant_value(left), constant_value(right)
                return scalar_constant(binary_scalar(operator, a, b))
            if is_error(left):
                return left
        if isinstance(right, Constant):
            if is_error(right):
                return self.error_after(left, right)
            if operator == "^":
                return self._power(left, right)
            if (operator, right.value) in {("+", 0.0), ("-", 0.0), ("*", 1.0), ("/", 1.0)}:
                return left
        elif operator == "-" and isinstance(left, Constant) and left.value == 0:
            return self.builder.emit(Op.NEGATE, right)
        return self.builder.emit(ARITHMETIC_OPS[operator], left, right)

    def error_after(self, left: Operand, error: Constant) -> Operand:
        """An error, unless the left operand is one already, which then wins."""
        return self.builder.emit(Op.SELECT, self.builder.emit(Op.IS_ERROR, left), left, error)

    def _power(self, base: Operand, exponent: Constant) -> Operand:
        """A power: small integer exponents by squaring, whose steps are shared between powers."""
        n = exponent.value
        if n == 1:
            return base
        if n == int(n) and 2 <= abs(n) <= _LARGEST_UNROLLED_POWER:
            result = self._integer_power(base, int(abs(n)))
            return result if n > 0 else self.builder.emit(Op.DIVIDE, constant(1.0), result)
        return self.builder.emit(Op.POWER, base, exponent)

    def _integer_power(self, base: Operand, n: int) -> Operand:
        result: Operand | None = None
        square = base
        while True:
            if n & 1:
                result = (
                    square if result is None else self.builder.emit(Op.MULTIPLY, result, square)
                )
            n >>= 1
            if not n:
                return base if result is None else result
            square = self.builder.emit(Op.MULTIPLY, square, square)

    def negate(self, value: Lowered) -> Lowered:
        """Unary minus."""
        operand = self.number(value)
        if isinstance(operand, Constant):
            if is_error(operand):
                return self.as_lowered(operand)
            return Known(-operand.value if operand.value else 0.0)
        return Numeric(self.builder.emit(Op.NEGATE, operand))

    def compare(self, operator: str, left: Lowered, right: Lowered) -> Lowered:
        """A comparison of single values."""
        if isinstance(left, Known) and isinstance(right, Known):
            return self._fold(operator, left, right)
        for value, other_first in ((left, False), (right, True)):
            if isinstance(value, Choice):
                then = self._compare_in_order(
                    operator, value.then, right if not other_first else left, other_first
                )
                otherwise = self._compare_in_order(
                    operator, value.otherwise, right if not other_first else left, other_first
                )
                return self.select(value.flag, then, otherwise)
        for value in (left, right):
            if isinstance(value, Known) and isinstance(value.value, ErrorValue):
                other = right if value is left else left
                if value is left:
                    return value
                return self.as_lowered(
                    self.error_after(self.number(other), self._known_number(value))
                )
        types = _type_of(left, right), _type_of(right, left)
        if types[0] == types[1]:
            return Flagged(
                self._comparison(
                    COMPARISON_OPS[operator], self._ordered(left), self._ordered(right)
                )
            )
        holds = _HOLDS[operator](types[0] - types[1])
        flags = [
            self._always(self.number(value), holds=holds)
            for value in (left, right)
            if not isinstance(value, Known)
        ]
        if len(flags) == 1:
            return Flagged(flags[0])
        return Flagged(self.builder.emit(Op.AND if holds else Op.OR, *flags))

    def _compare_in_order(
        self, operator: str, part: Lowered, other: Lowered, other_first: bool
    ) -> Lowered:
        return (
            self.compare(operator, other, part)
            if other_first
            else self.compare(operator, part, other)
        )

    def _ordered(self, value: Lowered) -> Operand:
        return self.exact_number(value)

    def _comparison(self, op: Op, left: Operand, right: Operand) -> Register:
        return self.builder.emit(op, left, right)

    def _always(self, operand: Operand, *, holds: bool) -> Register:
        """A flag that is the same in all draws but for those in which the operand is an error."""
        return self.builder.emit(Op.EQUAL if holds else Op.LESS, operand, operand)

    def select(self, flag: Operand, then: Lowered, otherwise: Lowered) -> Lowered:
        """IF on lowered values.

        Raises:
            UnlowerableError: The branches are arrays of different shapes, or too deeply mixed.
        """
        if isinstance(flag, Constant):
            if is_error(flag):
                return Known(decode_error(flag.value))
            return then if flag.value else otherwise
        if isinstance(then, Block) or isinstance(otherwise, Block):
            return self._select_blocks(flag, then, otherwise)
        if _is_numeric(then) and _is_numeric(otherwise):
            a, b = self.number(then), self.number(otherwise)
            return Numeric(self.builder.emit(Op.SELECT, flag, a, b))
        if _is_logical(then) and _is_logical(otherwise):
            a, b = self.flag(then), self.flag(otherwise)
            return Flagged(self.builder.emit(Op.SELECT_FLAG, flag, a, b))
        if isinstance(then, Varied) or isinstance(otherwise, Varied):
            raise UnlowerableError("text that varies from draw to draw")
        if _depth(then) >= _DEEPEST_CHOICE or _depth(otherwise) >= _DEEPEST_CHOICE:
            raise UnlowerableError("a value of many types")
        return Choice(flag, then, otherwise)

    def _select_blocks(self, flag: Operand, then: Lowered, otherwise: Lowered) -> Lowered:
        if not (isinstance(then, Block) and isinstance(otherwise, Block)) or (
            then.rows,
            then.columns,
        ) != (
            otherwise.rows,
            otherwise.columns,
        ):
            raise UnlowerableError("arrays of different shapes")
        items = tuple(
            self.select(flag, a, b) for a, b in zip(then.items, otherwise.items, strict=True)
        )
        return Block(then.rows, then.columns, items)

    def as_object(self, value: Choice | Known) -> Register:
        """The object register that holds a value of whatever type it is in each draw.

        Raises:
            UnlowerableError: An array or a reference is among what it may be.
        """
        part = self._part(value)
        if part.operand is not None:
            return part.operand
        return self.builder.emit_choice(MixedChoice(constant(1.0), part, part))

    def _part(self, value: Lowered) -> Part:
        if isinstance(value, Choice):
            flag = self.number(self.flag_as_lowered(value.flag))
            choice = MixedChoice(flag, self._part(value.then), self._part(value.otherwise))
            return Part(self.builder.emit_choice(choice), Kind.OBJECT)
        if isinstance(value, Varied) and isinstance(value.operand, Register):
            return Part(value.operand, Kind.OBJECT)
        if isinstance(value, Flagged):
            operand, kind = self.number(value), Kind.FLAG
        elif isinstance(value, Numeric):
            operand, kind = self.settled(value), Kind.NUMBER
        elif isinstance(value, Known) and not isinstance(value.value, (Reference, LambdaValue)):
            return Part(None, Kind.OBJECT, value.value)
        else:
            raise UnlowerableError("an array stands where a single value is wanted")
        if isinstance(operand, Constant):
            raise UnlowerableError("a constant that varies")
        return Part(operand, kind)

    def logical(self, op: Op, left: Operand, right: Operand) -> Operand:
        """AND or OR of two flags; constants are folded as far as errors allow."""
        for a, b in ((left, right), (right, left)):
            if isinstance(a, Constant) and not is_error(a):
                neutral = 1.0 if op is Op.AND else 0.0
                if a.value == neutral:
                    return b
        if isinstance(left, Constant) and isinstance(right, Constant):
            if is_error(left):
                return left
            return right if is_error(right) else left
        return self.builder.emit(op, left, right)

    def opposite(self, flag: Operand) -> Operand:
        """NOT of a flag."""
        if isinstance(flag, Constant):
            return flag if is_error(flag) else constant(1.0 - flag.value)
        return self.builder.emit(Op.NOT, flag)

    def flag_as_lowered(self, operand: Operand) -> Lowered:
        """A flag operand as a lowered value."""
        if isinstance(operand, Constant):
            return Known(decode_error(operand.value) if is_error(operand) else bool(operand.value))
        return Flagged(operand)


def constant_value(operand: Constant) -> float | ErrorValue:
    """The number or error that a constant holds."""
    return decode_error(operand.value) if is_error(operand) else operand.value


def scalar_constant(value: Scalar) -> Constant:
    """The constant for a number or an error.

    Raises:
        UnlowerableError: It is neither.
    """
    if isinstance(value, ErrorValue):
        return constant(encode_error(value))
    if isinstance(value, float):
        return constant(value)
    raise UnlowerableError("a value that is no number")


def is_error(operand: Operand) -> bool:
    """Whether an operand is a constant error."""
    return isinstance(operand, Constant) and operand.value != operand.value


def _is_numeric(value: Lowered) -> bool:
    if isinstance(value, Known):
        return isinstance(value.value, (float, ErrorValue))
    return isinstance(value, Numeric)


def _is_logical(value: Lowered) -> bool:
    return isinstance(value, Flagged) or (
        isinstance(value, Known) and isinstance(value.value, bool)
    )


def _depth(value: Lowered) -> int:
    return 1 + max(_depth(value.then), _depth(value.otherwise)) if isinstance(value, Choice) else 0


def _type_of(value: Lowered, other: Lowered) -> int:
    """The place of a value's type in the order number, text, logical; a blank takes the other's."""
    if isinstance(value, Known):
        content = value.value
        if content is None:
            return _LOGICAL if isinstance(other, Flagged) else _NUMBER
        if isinstance(content, bool):
            return _LOGICAL
        if isinstance(content, str):
            return _TEXT
        if isinstance(content, float):
            return _NUMBER
    elif isinstance(value, Numeric):
        return _NUMBER
    elif isinstance(value, Flagged):
        return _LOGICAL
    raise UnlowerableError("a comparison with text that varies, or with an array")


_HOLDS = {
    "=": lambda order: order == 0,
    "<>": lambda order: order != 0,
    "<": lambda order: order < 0,
    "<=": lambda order: order <= 0,
    ">": lambda order: order > 0,
    ">=": lambda order: order >= 0,
}
