"""Recalculates a workbook in LibreOffice, so that a sample's stored values are independent of cellsim."""

from __future__ import annotations

import shutil
import subprocess
import tempfile
from pathlib import Path


def recalculate(model: Path) -> None:
    """Open a workbook in LibreOffice without a screen and save it again with every value calculated.

    Raises:
        RuntimeError: if LibreOffice is not installed or did not write the workbook.
    """
    program = shutil.which("soffice") or shutil.which("libreoffice")
    if program is None:
        raise RuntimeError(
            "LibreOffice is needed to calculate the samples: install libreoffice-calc"
        )
    with tempfile.TemporaryDirectory() as folder:
        done = subprocess.run(  # noqa: S603 - the program found above, on a file of ours
            [
                program,
                f"-env:UserInstallation=file://{folder}/profile",
                "--headless",
                "--convert-to",
                "xlsx:Calc MS Excel 2007 XML",
                "--outdir",
                f"{folder}/out",
                str(model),
            ],
            capture_output=True,
            text=True,
            timeout=300,
            check=False,
        )
        written = Path(folder) / "out" / model.name
        if done.returncode or not written.exists():
            raise RuntimeError(f"LibreOffice did not write {model.name}: {done.stderr.strip()}")
        shutil.move(written, model)
