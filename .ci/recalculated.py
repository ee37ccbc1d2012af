"""Share of a folder's formula cells that are recalculated, not copied, and agree with what is stored."""

import sys
from pathlib import Path

import cellsim

folder, floor = Path(sys.argv[1]), float(sys.argv[2])
good = whole = copied = 0
for path in sorted(folder.glob("*.xls[xm]")):
    check = cellsim.load(path).check()
    missing = sum(count for _, count, _ in check.unsupported)
    good, whole, copied = good + check.agreeing, whole + check.compared + missing, copied + missing
share = 100 * good / whole
print(
    f"recalculated and agreeing {good} of {whole} ({share:.3f} %), {copied} not calculated; floor {floor} %"
)
sys.exit(share < floor)
