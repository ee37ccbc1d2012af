"""A family of distributions, declared: its parameters, the sets of them that fix it, how to build."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TypeAlias, TypeGuard

from cellsim.uncertainty.distributions.distribution import Distribution

ParameterValue: TypeAlias = float | tuple[float, ...]
Check: TypeAlias = Callable[[ParameterValue], str | None]
"""Answers what was expected, such as "a number above 0", if the value does not fit; else None."""

_QUANTILE_KEY = re.compile(r"p([0-9]{1,2})(?:_([0-9]+))?\Z")


class ParameterError(ValueError):
    """A parameter does not fit its family.

    Attributes:
        key: The parameter's key in the side-car, or "" when the set of keys is at fault.
        message: What was read and what was expected.
    """

    def __init__(self, key: str, message: str) -> None:
        super().__init__(f"{key}: {message}" if key else message)
        self.key = key
        self.message = message


def any_number(value: ParameterValue) -> str | None:
    """Accepts every finite number."""
    return None if _is_finite(value) else "a finite number"


def positive(value: ParameterValue) -> str | None:
    """Accepts numbers above 0."""
    return None if _is_finite(value) and value > 0 else "a number above 0"


def probability(value: ParameterValue) -> str | None:
    """Accepts numbers from 0 to 1."""
    return None if _is_finite(value) and 0 <= value <= 1 else "a probability from 0 to 1"


def number_list(value: ParameterValue) -> str | None:
    """Accepts lists of one or more finite numbers."""
    fits = isinstance(value, tuple) and value and all(math.isfinite(item) for item in value)
    return None if fits else "a list of one or more finite numbers"


def probability_list(value: ParameterValue) -> str | None:
    """Accepts lists of probabilities that sum to 1 within 1e-9."""
    if not (isinstance(value, tuple) and value):
        return "a list of probabilities"
    if not all(0 <= item <= 1 for item in value):
        return "probabilities from 0 to 1"
    return None if abs(math.fsum(value) - 1) <= 1e-9 else "probabilities that sum to 1"


def _is_finite(value: ParameterValue) -> TypeGuard[float]:
    return not isinstance(value, tuple) and math.isfinite(value)


@dataclass(frozen=True, slots=True)
class ParameterSet:
    """Parameters that together fix a distribution.

    Attributes:
        keys: The keys that must be given.
        build: Makes the distribution; takes every given key by name, and the quantiles, if any, as
            `quantiles`, pairs of probability and value in rising order of probability. Raises
            `ParameterError`. A key that may be left out has its default in the signature.
        optional: Keys that may be given too.
        quantiles: How many quantiles (`p10`, `p50`, `p2_5`) must be given.
    """

    keys: tuple[str, ...]
    build: Callable[..., Distribution]
    optional: tuple[str, ...] = ()
    quantiles: int = 0

    def fits(self, keys: Collection[str]) -> bool:
        """Whether exactly these keys may be given together."""
        plain = {key for key in keys if quantile_probability(key) is None}
        return (
            plain.issuperset(self.keys)
            and plain.issubset(self.keys + self.optional)
            and len(keys) - len(plain) == self.quantiles
        )

    def __str__(self) -> str:
        quantiles = [f"{_COUNTS[self.quantiles]} (such as p10 and p90)"] if self.quantiles else []
        optional = f" (and {join_words(self.optional, 'or')} if wanted)" if self.optional else ""
        return join_words([*self.keys, *quantiles], "and") + optional


_COUNTS = ("no quantiles", "one quantile", "two quantiles", "three quantiles")


@dataclass(frozen=True, slots=True)
class Family:
    """A family of distributions as it can be asked for.

    Attributes:
        name: Its name in a side-car.
        checks: What each parameter must be by itself; quantiles are any numbers that rise.
        sets: The sets of parameters, any one of which fixes a distribution.
        rising: Keys whose values must not fall from one to the next, and rise from first to last.
    """

    name: str
    checks: Mapping[str, Check]
    sets: tuple[ParameterSet, ...]
    rising: tuple[str, ...] = ()

    @property
    def takes_quantiles(self) -> bool:
        """Whether any of the sets holds quantiles."""
        return any(one.quantiles for one in self.sets)

    def knows(self, key: str) -> bool:
        """Whether the key is a parameter of the family in any of the sets."""
        quantile = self.takes_quantiles and quantile_probability(key) is not None
        return quantile or key in self.checks

    def set_for(self, keys: Collection[str]) -> ParameterSet:
        """The set of parameters that the keys form.

        Raises:
            ParameterError: They form none; the message says which sets there are.
        """
        for one in self.sets:
            if one.fits(keys):
                return one
        wanted = "; or ".join(str(one) for one in self.sets)
        read = join_words(list(keys), "and") or "no parameters"
        raise ParameterError("", f"{self.name} takes {wanted}; read {read}")

    def faults(self, known: Mapping[str, ParameterValue]) -> list[ParameterError]:
        """What is wrong with the parameters whose values are known, each by itself and in order."""
        found = []
        for key, value in known.items():
            expected = self.checks.get(key, any_number)(value)
            if expected:
                found.append(ParameterError(key, f"{key} must be {expected}, read {spell(value)}"))
        if not found:
            found.extend(self._order_faults(known))
        return found

    def _order_faults(self, known: Mapping[str, ParameterValue]) -> list[ParameterError]:
        found = []
        rising = [key for key in self.rising if key in known]
        for left, right in pairwise(rising):
            if known[left] > known[right]:  # type: ignore[operator]  # checked to be numbers
                found.append(_order_fault(left, right, "not be above", known))
        if not found and len(rising) > 1 and known[rising[0]] == known[rising[-1]]:
            found.append(_order_fault(rising[0], rising[-1], "be below", known))
        quantiles = [
            (probability, key) for key in known if (probability := quantile_probability(key))
        ]
        by_probability = sorted(quantiles, key=lambda quantile: quantile[0])
        for (first, left), (second, right) in pairwise(by_probability):
            if first == second:
                message = f"{left} and {right} are the same quantile"
                found.append(ParameterError(right, message))
            elif known[left] >= known[right]:  # type: ignore[operator]
                found.append(_order_fault(left, right, "be below", known))
        return found

    def build(self, parameters: Mapping[str, ParameterValue]) -> Distribution:
        """The distribution with these parameters.

        Raises:
            ParameterError: They do not fit the family.
        """
        chosen = self.set_for(parameters)
        for fault in self.faults(parameters):
            raise fault
        named: dict[str, object] = {
            key: value for key, value in parameters.items() if quantile_probability(key) is None
        }
        if chosen.quantiles:
            named["quantiles"] = sorted(
                (probability, value)
                for key, value in parameters.items()
                if (probability := quantile_probability(key)) is not None
            )
        return chosen.build(**named)


def quantile_probability(key: str) -> float | None:
    """The probability that a key such as `p05`, `p50` or `p2_5` names; None if it names none."""
    match = _QUANTILE_KEY.match(key)
    if match is None:
        return None
    percent = float(f"{match[1]}.{match[2] or 0}")
    return percent / 100 if percent > 0 else None


def spell(value: ParameterValue) -> str:
    """A parameter's value as a person writes it."""
    if isinstance(value, tuple):
        return "[" + ", ".join(spell(item) for item in value) + "]"
    return f"{value:.12g}"


def join_words(words: Sequence[str], last: str) -> str:
    """`a, b and c`."""
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} {last} {words[-1]}"


def _order_fault(
    left: str, right: str, relation: str, known: Mapping[str, ParameterValue]
) -> ParameterError:
    values = f"{spell(known[left])} and {spell(known[right])}"
    return ParameterError(left, f"{left} must {relation} {right}, read {values}")
