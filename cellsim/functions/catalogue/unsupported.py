"""Functions that cannot mean anything here, each with the reason that the user reads."""

from __future__ import annotations

_WEB = "it reads from the network, which a repeatable calculation cannot"
_CUBE = "it reads from an analysis server"
_LIVE = "it reads live or linked data that is not in the file"
_PIVOT = "it reads from a pivot table's cache"
_ADD_IN = "it belongs to an add-in or a macro, which is not run"

_REASONS: dict[str, str] = {
    "WEBSERVICE": _WEB,
    "FILTERXML": _WEB,
    "IMAGE": _WEB,
    "IMPORTDATA": _WEB,
    "CUBEKPIMEMBER": _CUBE,
    "CUBEMEMBER": _CUBE,
    "CUBEMEMBERPROPERTY": _CUBE,
    "CUBERANKEDMEMBER": _CUBE,
    "CUBESET": _CUBE,
    "CUBESETCOUNT": _CUBE,
    "CUBEVALUE": _CUBE,
    "RTD": _LIVE,
    "STOCKHISTORY": _LIVE,
    "FIELDVALUE": _LIVE,
    "GETPIVOTDATA": _PIVOT,
    "PIVOTBY": _PIVOT,
    "CALL": _ADD_IN,
    "REGISTER.ID": _ADD_IN,
    "EUROCONVERT": _ADD_IN,
    "SQL.REQUEST": _ADD_IN,
    "PY": "it runs Python on a server of the spreadsheet's maker",
    "COPILOT": _WEB,
    "TRANSLATE": _WEB,
    "DETECTLANGUAGE": _WEB,
}


def unsupported_reason(name: str) -> str | None:
    """Why a function in upper case is not calculated; None if it is not one of these."""
    return _REASONS.get(name)


def unsupported_functions() -> dict[str, str]:
    """All of them, with their reasons."""
    return dict(_REASONS)
