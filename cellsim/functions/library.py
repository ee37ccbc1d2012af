"""Loads every family of the catalogue, so that the registry is full."""

from __future__ import annotations

import importlib
import pkgutil

from cellsim.functions import catalogue

for _module in sorted(module.name for module in pkgutil.iter_modules(catalogue.__path__)):
    importlib.import_module(f"{catalogue.__name__}.{_module}")
