"""Recalculates a workbook in LibreOffice, so that a sample's stored values are independent of cellsim."""

from __future__ import annotations

import shutil
import subprocess
import tempfile
from pathlib import Path

_ALWAYS_RECALCULATE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load">
<prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>0</value></prop>
</item>
</oor:items>
"""


def recalculate(model: Path, *, rounds: int = 1) -> None:
    """Open a workbook in LibreOffice without a screen and save it again with every value calculated.

    Args:
        model: The workbook, which is replaced.
        rounds: How often. A circular model nears its solution by a few passes each time it is calculated.

    Raises:
        RuntimeError: if LibreOffice is not installed or did not write the workbook.
    """
    program = shutil.which("soffice") or shutil.which("libreoffice")
    if program is None:
        raise RuntimeError(
            "LibreOffice is needed to calculate the samples: install libreoffice-calc"
        )
    with tempfile.TemporaryDirectory() as folder:
        settings = Path(folder) / "profile" / "user" / "registrymodifications.xcu"
        settings.parent.mkdir(parents=True)
        settings.write_text(_ALWAYS_RECALCULATE, encoding="utf-8")
        for _ in range(rounds):
            _convert(program, model, Path(folder))


def _convert(program: str, model: Path, folder: Path) -> None:
    done = subprocess.run(  # noqa: S603 - the program found above, on a file of ours
        [
            program,
            f"-env:UserInstallation={(folder / 'profile').as_uri()}",
            "--headless",
            "--convert-to",
            "xlsx:Calc MS Excel 2007 XML",
            "--outdir",
            str(folder / "out"),
            str(model),
        ],
        capture_output=True,
        text=True,
        timeout=300,
        check=False,
    )
    written = folder / "out" / model.name
    if done.returncode or not written.exists():
        raise RuntimeError(f"LibreOffice did not write {model.name}: {done.stderr.strip()}")
    shutil.move(written, model)
