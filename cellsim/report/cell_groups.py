"""Many cells of one kind told as few ranges."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from cellsim.cells import CellRef, RangeRef, parse_address, range_of


def grouped(cells: Iterable[tuple[str, str]]) -> list[tuple[str, str, int]]:
    """Cells with the same reason side by side or one below the other, told as ranges.

    Args:
        cells: Each a place, such as `Costs!C14`, and a reason. A place that is no cell stands alone;
            what is said twice counts once.

    Returns:
        Ranges, their reason and the number of cells, in the order of each reason's first cell.
    """
    by_reason: dict[str, dict[str, CellRef | None]] = {}
    for place, reason in cells:
        by_reason.setdefault(reason, {})[place] = _cell(place)
    found: list[tuple[str, str, int]] = []
    for reason, places in by_reason.items():
        known = [cell for cell in places.values() if cell is not None]
        found += [(str(area), reason, area.size) for area in _areas(known)]
        found += [(place, reason, 1) for place, cell in places.items() if cell is None]
    return found


def _cell(place: str) -> CellRef | None:
    title, _, address = place.rpartition("!")
    position = parse_address(address)
    if not title or position is None:
        return None
    if len(title) > 1 and title[0] == title[-1] == "'":
        title = title[1:-1].replace("''", "'")
    return CellRef(title, *position)


def _areas(cells: Sequence[CellRef]) -> list[RangeRef]:
    """Rows of neighbours, then equal rows that follow each other."""
    rows: list[RangeRef] = []
    for cell in sorted(cells):
        last = rows[-1] if rows else None
        if last is not None and last.holds(cell.sheet, cell.row, cell.column - 1):
            rows[-1] = last._replace(last_column=cell.column)
        else:
            rows.append(range_of(cell))
    areas: list[RangeRef] = []
    for row in sorted(rows, key=lambda area: (area.sheet, area.first_column, area.first_row)):
        last = areas[-1] if areas else None
        if last is not None and row == last._replace(
            first_row=last.last_row + 1, last_row=last.last_row + 1
        ):
            areas[-1] = last._replace(last_row=row.last_row)
        else:
            areas.append(row)
    return sorted(areas)
