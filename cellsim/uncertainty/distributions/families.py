"""Every family of distributions by name, and the one way to build a distribution."""

from __future__ import annotations

import dataclasses
import importlib
import pkgutil
from collections.abc import Collection, Mapping

from cellsim.uncertainty.distributions import catalogue
from cellsim.uncertainty.distributions.distribution import Distribution
from cellsim.uncertainty.distributions.family import (
    Family,
    ParameterError,
    ParameterValue,
    join_words,
    spell,
)
from cellsim.uncertainty.distributions.truncated import truncate

_MODULES = [
    importlib.import_module(f"{catalogue.__name__}.{name}")
    for name in sorted(module.name for module in pkgutil.iter_modules(catalogue.__path__))
]
FAMILIES: Mapping[str, Family] = {
    family.name: family for module in _MODULES for family in module.FAMILIES
}


def build_distribution(
    family: str,
    parameters: Mapping[str, ParameterValue],
    floor: float | None = None,
    cap: float | None = None,
) -> Distribution:
    """Builds a distribution.

    Args:
        family: Name of its family, a key of `FAMILIES`.
        parameters: Its parameters by key; the keys form one of the family's parameter sets.
        floor: Makes it conditional on values not below this one.
        cap: Makes it conditional on values not above this one.

    Returns:
        The distribution; with a floor or a cap the conditional one, whose mean and standard
        deviation are not those that it was asked for without them.

    Raises:
        ParameterError: The family is not known or a parameter does not fit; `key` says which.
    """
    if family not in FAMILIES:
        known = join_words(sorted(FAMILIES), "and")
        raise ParameterError("distribution", f"no distribution is called {family}; known: {known}")
    built = truncate(FAMILIES[family].build(parameters), floor, cap)
    bounds = {"floor": floor, "cap": cap}
    given = {**parameters, **{key: value for key, value in bounds.items() if value is not None}}
    words = ", ".join([family, *(f"{key} {spell(value)}" for key, value in given.items())])
    return dataclasses.replace(built, family=family, words=words)


def parameter_faults(
    family: str,
    known: Mapping[str, ParameterValue],
    keys: Collection[str],
    floor: float | None = None,
    cap: float | None = None,
) -> list[ParameterError]:
    """What is wrong with parameters of which some values may not be known yet.

    Args:
        family: Name of a family, a key of `FAMILIES`.
        known: The parameters whose values are known.
        keys: All keys given.
        floor: The floor if there is one and its value is known.
        cap: The cap if there is one and its value is known.

    Returns:
        All faults found; without unknown values, an empty list means that the distribution can be
        built.
    """
    declared = FAMILIES[family]
    faults = declared.faults({key: value for key, value in known.items() if declared.knows(key)})
    try:
        declared.set_for(keys)
        if not faults and len(known) == len(keys):
            build_distribution(family, known, floor, cap)
    except ParameterError as fault:
        faults.append(fault)
    return faults
