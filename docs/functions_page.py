"""Writes `docs/functions.md` from the registry: `python docs/functions_page.py`."""

from __future__ import annotations

from itertools import groupby
from pathlib import Path

import cellsim.functions.library  # noqa: F401  (fills the registry)
from cellsim.functions.catalogue.unsupported import unsupported_functions
from cellsim.functions.registry import FunctionRecord, all_functions, all_over_draws
from cellsim.program.lower_branches import LAZY_RULES
from cellsim.program.lower_functions import RULES

PAGE = Path(__file__).with_name("functions.md")
_SPECIAL_FORMS = {
    "LET": ("name, value, ..., expression", "Names values for use in an expression."),
    "LAMBDA": ("parameter, ..., expression", "A function of one's own."),
    "ISOMITTED": ("parameter", "Whether an argument of a LAMBDA was left out."),
}


def functions_page() -> str:
    """The page as Markdown."""
    functions = all_functions()
    arrays = set(all_over_draws()) | set(LAZY_RULES) | set(RULES)
    count = len(functions) + len(_SPECIAL_FORMS)
    lines = [
        "# Spreadsheet functions",
        "",
        "Written from the registry by `python docs/functions_page.py`; a test keeps it true.",
        "",
        f'cellsim calculates {count} functions. Where "arrays" stands in the last column, a call whose',
        "arguments are uncertain numbers is evaluated over whole blocks of draws; the others are right",
        "too, but are taken draw by draw, and the run names the cells.",
    ]
    by_family = sorted(functions.values(), key=lambda record: (record.module, record.name))
    for family, records in groupby(by_family, key=lambda record: record.module):
        title = family.rpartition(".")[2].replace("_", " ")
        lines += [
            "",
            f"## {title[0].upper()}{title[1:]}",
            "",
            "| function | what it gives | draws |",
        ]
        lines.append("| --- | --- | --- |")
        lines += [
            f"| `{record.name}({_arguments(record)})` | {_cell(record.documentation)} |"
            f" {'arrays' if record.name in arrays else ''} |"
            for record in records
        ]
    lines += ["", "## Names and functions of one's own", "", "| function | what it gives | draws |"]
    lines.append("| --- | --- | --- |")
    lines += [
        f"| `{name}({arguments})` | {text} | {'arrays' if name == 'LET' else ''} |"
        for name, (arguments, text) in _SPECIAL_FORMS.items()
    ]
    lines += [
        "",
        "## Not calculated",
        "",
        "A cell that calls one of these keeps the value stored in the file, and the check says so. If the",
        "cell depends on an uncertain input, its draws fail with #NAME?.",
        "",
        "| function | why not |",
        "| --- | --- |",
    ]
    lines += [f"| `{name}` | {why} |" for name, why in sorted(unsupported_functions().items())]
    return "\n".join(lines) + "\n"


def _arguments(record: FunctionRecord) -> str:
    names = []
    for place, parameter in enumerate(record.parameters):
        name = parameter.name.strip("_")
        if parameter.variadic:
            name = f"{name}, ..."
        names.append(name if place < record.least or parameter.variadic else f"[{name}]")
    return ", ".join(names)


def _cell(text: str) -> str:
    return text.replace("|", "\\|")


if __name__ == "__main__":
    PAGE.write_text(functions_page(), encoding="utf-8")
