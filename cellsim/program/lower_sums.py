"""Sums, extremes and counts of what is in ranges, where only numbers count.

A cell may be a number in some draws and text in others, such as `IF(x > 0, x, "")`: such an item comes
with a flag that says in which draws it counts.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

from cellsim.program.emit import is_error
from cellsim.program.ir import Constant, Op, Operand, constant
from cellsim.program.lower_calls import Arguments, item_operands
from cellsim.program.lowered import Choice, Known, Lowered, Numeric, Varied
from cellsim.values import ErrorValue, Reference, decode_error

_ZERO = constant(0.0)
_ONE = constant(1.0)
_LARGEST = 1.7976931348623157e308
"""Stands in a search for the least number where there is none; an infinity would become an error."""


@dataclass(frozen=True, slots=True)
class CountedItem:
    """A number that may count.

    Attributes:
        counts: The flag of the draws in which it counts.
        value: The number; zero where it does not count, an error where there is one.
    """

    counts: Operand
    value: Operand


def items_of(given: Arguments, position: int) -> Iterable[Lowered]:
    """The items of an argument; those of a union area by area."""
    value = given.values[position]
    if isinstance(value, Known) and isinstance(value.value, Reference):
        for area in value.value.areas:
            yield from given.lowering.cells.area_block(area).items
        return
    yield from given.block(position).items


def _numbers(given: Arguments, first: int = 0) -> list[CountedItem]:
    """The numbers of the arguments from a place on, in order."""
    found: list[CountedItem] = []
    for position, value in enumerate(given.values[first:], start=first):
        if not given.is_range(position):
            found.append(CountedItem(_ONE, given.emitter.number(value)))
            continue
        items = (counted_item(given, item) for item in items_of(given, position))
        found += [item for item in items if item.counts != _ZERO]
    return found


def counted_item(given: Arguments, item: Lowered) -> CountedItem:
    """An item of a range as a number that may count."""
    if isinstance(item, Choice):
        then, otherwise = counted_item(given, item.then), counted_item(given, item.otherwise)
        emit = given.emitter.builder.emit
        return CountedItem(
            emit(Op.SELECT_FLAG, item.flag, then.counts, otherwise.counts),
            emit(Op.SELECT, item.flag, then.value, otherwise.value),
        )
    operands = item_operands(given.emitter, item)
    return CountedItem(_ONE, operands[0]) if operands else CountedItem(_ZERO, _ZERO)


def _instead(given: Arguments, item: CountedItem, neutral: Operand) -> Operand:
    """The number of an item, another where it does not count."""
    if isinstance(item.counts, Constant) or neutral == _ZERO:
        return item.value
    return given.emitter.builder.emit(Op.SELECT, item.counts, item.value, neutral)


def _any_counts(given: Arguments, items: Iterable[CountedItem]) -> Operand:
    result: Operand = _ZERO
    for item in items:
        result = given.emitter.logical(Op.OR, result, item.counts)
    return result


def add_up(given: Arguments, operands: Iterable[Operand]) -> Operand:
    """The sum of operands, from left to right."""
    total: Operand = _ZERO
    for operand in operands:
        if isinstance(total, Constant) and total.value == 0:
            total = operand
        else:
            total = given.emitter.arithmetic_operands("+", total, operand)
    return total


def sum_rule(given: Arguments) -> Lowered:
    """SUM."""
    return sum_of(given, _numbers(given))


def sum_of(given: Arguments, items: Sequence[CountedItem]) -> Lowered:
    """The sum of what counts."""
    return given.emitter.as_lowered(add_up(given, (item.value for item in items)))


def average_rule(given: Arguments) -> Lowered:
    """AVERAGE."""
    return average_of(given, _numbers(given))


def average_of(given: Arguments, items: Sequence[CountedItem]) -> Lowered:
    """The mean of what counts; #DIV/0! where nothing does."""
    if not items:
        return Known(ErrorValue.DIV0)
    total = add_up(given, (item.value for item in items))
    count = how_many(given, (item.counts for item in items))
    return given.emitter.as_lowered(given.emitter.arithmetic_operands("/", total, count))


def how_many(given: Arguments, flags: Iterable[Operand]) -> Operand:
    """The number of flags that are set."""
    always = 0
    sometimes: list[Operand] = []
    for flag in flags:
        if isinstance(flag, Constant):
            always += bool(flag.value)
        else:
            sometimes.append(given.emitter.builder.emit(Op.AS_NUMBER, flag))
    if not sometimes:
        return constant(float(always))
    return given.emitter.arithmetic_operands("+", add_up(given, sometimes), constant(float(always)))


def extreme_rule(op: Op) -> Callable[[Arguments], Lowered | None]:
    """MIN or MAX."""
    return lambda given: extreme_of(op, given, _numbers(given))


def _zero_without_items(
    given: Arguments, items: Sequence[CountedItem], result: Operand | None
) -> Lowered:
    """A result over items, zero in draws in which none of them counts."""
    if result is None:
        return Known(0.0)
    if not any(isinstance(item.counts, Constant) for item in items):
        some = _any_counts(given, items)
        result = given.emitter.builder.emit(Op.SELECT, some, result, _ZERO)
    return given.emitter.as_lowered(result)


def extreme_of(op: Op, given: Arguments, items: Sequence[CountedItem]) -> Lowered | None:
    """The least or greatest of what counts; zero where nothing does."""
    pick = min if op is Op.MINIMUM else max
    neutral = constant(_LARGEST if op is Op.MINIMUM else -_LARGEST)
    operands = [_instead(given, item, neutral) for item in items]
    fixed = [operand for operand in operands if isinstance(operand, Constant)]
    varying = [operand for operand in operands if not isinstance(operand, Constant)]
    failing = [operand for operand in fixed if is_error(operand)]
    if failing:
        return Known(decode_error(failing[0].value)) if not varying else None
    result: Operand | None = constant(pick(operand.value for operand in fixed)) if fixed else None
    for operand in varying:
        result = operand if result is None else given.emitter.builder.emit(op, result, operand)
    return _zero_without_items(given, items, result)


def count_rule(given: Arguments) -> Lowered | None:
    """COUNT: numbers in ranges; errors do not count."""
    flags: list[Operand] = []
    for position, value in enumerate(given.values):
        if not given.is_range(position):
            if not isinstance(value, (Numeric, Known)):
                return None
            if isinstance(value, Known) and not isinstance(value.value, (float, ErrorValue)):
                return None  # numbers in text count here, and other rules of single values
            flags.append(_is_no_error(given, counted_item(given, value)))
            continue
        flags += [
            _is_no_error(given, counted_item(given, item)) for item in items_of(given, position)
        ]
    return given.emitter.as_lowered(how_many(given, flags))


def _is_no_error(given: Arguments, item: CountedItem) -> Operand:
    """The flag of the draws in which an item counts and is no error; itself never an error."""
    if isinstance(item.value, Constant):
        return _ZERO if is_error(item.value) or item.counts == _ZERO else _ONE
    failing = given.emitter.builder.emit(Op.IS_ERROR, item.value)
    if isinstance(item.counts, Constant):
        return given.emitter.opposite(failing)
    return given.emitter.builder.emit(Op.SELECT_FLAG, failing, _ZERO, item.counts)


def count_all_rule(given: Arguments) -> Lowered | None:
    """COUNTA: whatever is not blank."""
    count = 0
    for position in range(len(given.values)):
        for item in items_of(given, position):
            if isinstance(item, Varied):
                return None
            count += not (isinstance(item, Known) and item.value is None)
    return Known(float(count))


def sum_of_products_rule(given: Arguments) -> Lowered:
    """SUMPRODUCT: what is no number counts as zero."""
    blocks = [given.block(position) for position in range(len(given.values))]
    if len({(block.rows, block.columns) for block in blocks}) != 1:
        return Known(ErrorValue.VALUE)
    products: list[Operand] = []
    for items in zip(*(block.items for block in blocks), strict=True):
        product: Operand | None = None
        for item in items:
            factor = counted_item(given, item).value
            product = (
                factor
                if product is None
                else given.emitter.arithmetic_operands("*", product, factor)
            )
        products.append(product or _ZERO)
    return given.emitter.as_lowered(add_up(given, products))


def product_rule(given: Arguments) -> Lowered:
    """PRODUCT: zero where nothing counts."""
    items = _numbers(given)
    result: Operand | None = None
    for item in items:
        factor = _instead(given, item, _ONE)
        result = (
            factor if result is None else given.emitter.arithmetic_operands("*", result, factor)
        )
    return _zero_without_items(given, items, result)


def net_present_value_rule(given: Arguments) -> Lowered | None:
    """NPV by Horner's rule from the last flow back; what does not count takes no period."""
    emitter = given.emitter
    flows = _numbers(given, first=1)
    if not any(isinstance(item.counts, Constant) for item in flows):
        return None
    growth = emitter.arithmetic_operands("+", emitter.number(given.values[0]), _ONE)
    total: Operand = _ZERO
    for item in reversed(flows):
        summed = (
            item.value if total == _ZERO else emitter.arithmetic_operands("+", total, item.value)
        )
        worth = emitter.arithmetic_operands("/", summed, growth)
        if not isinstance(item.counts, Constant):
            worth = emitter.builder.emit(Op.SELECT, item.counts, worth, total)
        total = worth
    return emitter.as_lowered(total)
