"""The form's lines: fields in columns, a cursor, and what fits into the room there is."""

from __future__ import annotations

from dataclasses import dataclass

from tui.workbench.form import Field, Row

StyledLine = list[tuple[str, str]]
Fields = tuple[Field, ...]
NAME_WIDTH = 3
HEAD_LINES = 1
"""Column heads stay in sight, as the conditions do."""
MOST_CONDITIONS = 2
"""Lines that the conditions may take where they don't fit into one."""
LEAST_LINES = 5
SHARE = 0.36
"""Most of the height that the form takes, where it stands below the figure."""
SHARE_BESIDE = 0.5
"""Most of the height that it takes beside the figure."""


@dataclass(frozen=True)
class Cursor:
    """Where the form's cursor is."""

    row: int = 2
    column: int = 2


def moved(cursor: Cursor, rows: list[Row], down: int, right: int) -> Cursor:
    """Move the cursor by rows and open fields, inside the form."""
    row = min(max(cursor.row + down, 0), len(rows) - 1)
    fields = rows[row].fields
    column = min(cursor.column, len(fields) - 1)
    if right:
        ahead = [n for n in range(len(fields)) if fields[n].open and (n - column) * right > 0]
        column = min(ahead, key=lambda n: abs(n - column), default=column)
    if not fields[column].open:
        open_fields = [n for n in range(len(fields)) if fields[n].open]
        column = min(open_fields, key=lambda n: abs(n - column))
    return Cursor(row, column)


def field_at(cursor: Cursor, rows: list[Row]) -> Field:
    """Find the field under the cursor."""
    inside = moved(cursor, rows, 0, 0)
    return rows[inside.row].fields[inside.column]


def sheet_height(rows: list[Row], screen_height: int, *, beside: bool, width: int = 200) -> int:
    """Give the form's height: all of its rows, where they leave room for the rest."""
    share = SHARE_BESIDE if beside else SHARE
    fixed = HEAD_LINES + min(len(_condition_parts(rows[0], width)), MOST_CONDITIONS)
    return max(LEAST_LINES, min(len(rows) - 1 + fixed, int(share * screen_height)))


def field_place(lines: list[StyledLine]) -> tuple[int, int, int] | None:
    """Find the cursor's field in the form's lines: its line, first column and width."""
    for number, line in enumerate(lines):
        column = 0
        for text, role in line:
            if role == "cursor":
                return number, column, len(text)
            column += len(text)
    return None


def sheet_lines(rows: list[Row], cursor: Cursor, width: int, height: int) -> list[StyledLine]:
    """Lay the form out in a given room, scrolled so that the cursor is in sight.

    Parameters
    ----------
    rows : list of Row
        Conditions first, then contacts and layers.
    width, height : int
        The room, in cells.
    """
    columns = rows[1].fields
    first, last = _columns_in_sight(columns, cursor, width)
    lines = _conditions(rows[0], cursor, width)
    fixed = len(lines) + HEAD_LINES
    room = max(1, height - fixed)
    stack = rows[1:]
    top = _top(cursor.row - 1, len(stack), room)
    lines[-1] = _with_more(lines[-1], top, max(0, len(stack) - top - room), width)
    lines.append(_heads(columns[first:last]))
    for n in range(top, min(top + room, len(stack))):
        at = cursor.column if cursor.row == n + 1 else -1
        lines.append(_stack_line(stack[n], at, first, last))
    return [_fitted(line, width) for line in lines]


def _top(row: int, count: int, room: int) -> int:
    """First row in sight: the cursor's in the middle where there is more than fits."""
    return max(0, min(row - room // 2, count - room))


def _columns_in_sight(columns: Fields, cursor: Cursor, width: int) -> tuple[int, int]:
    """First column, and the one behind the last, that fit with the cursor's among them."""
    wanted = cursor.column if cursor.row > 0 else 0
    room = width - NAME_WIDTH
    first = 0
    while sum(column.width + 1 for column in columns[first : wanted + 1]) > room and first < wanted:
        first += 1
    last, used = first, 0
    while last < len(columns) and used + columns[last].width + 1 <= room:
        used += columns[last].width + 1
        last += 1
    return first, max(last, first + 1)


def _condition_parts(row: Row, width: int) -> list[list[int]]:
    """Break the conditions into lines; give the indices of each line's fields."""
    lines: list[list[int]] = [[]]
    used = 0
    for n, field in enumerate(row.fields):
        size = len(field.head) + len(field.text) + 4
        if lines[-1] and used + size > width:
            lines.append([])
            used = 0
        lines[-1].append(n)
        used += size
    return lines


def _conditions(row: Row, cursor: Cursor, width: int) -> list[StyledLine]:
    """Write the conditions, those around the cursor where not all lines have room."""
    here = min(cursor.column, len(row.fields) - 1) if cursor.row == 0 else -1
    parts = _condition_parts(row, width)
    at = next((n for n, part in enumerate(parts) if here in part), 0)
    first = max(0, min(at, len(parts) - MOST_CONDITIONS))
    lines: list[StyledLine] = []
    for part in parts[first : first + MOST_CONDITIONS]:
        line: StyledLine = []
        for n in part:
            field = row.fields[n]
            role = "cursor" if n == here else "strong"
            line += [(f" {field.head} ", "faint"), (f" {field.text} ", role)]
        lines.append(line)
    if len(parts) > MOST_CONDITIONS:
        lines[0].append((" <" if first else "", "faint"))
        lines[-1].append((" >" if first + MOST_CONDITIONS < len(parts) else "", "faint"))
    return lines


def _heads(columns: Fields) -> StyledLine:
    line: StyledLine = [(" " * NAME_WIDTH, "head")]
    for column in columns:
        line.append((" " + _aligned(column.head, column.width, column.left_aligned), "head"))
    return line


def _stack_line(row: Row, at: int, first: int, last: int) -> StyledLine:
    line: StyledLine = [(row.name.rjust(NAME_WIDTH), "here" if at >= 0 else "faint")]
    for n in range(first, min(last, len(row.fields))):
        field = row.fields[n]
        text = _aligned(field.text, field.width, field.left_aligned)
        role = "cursor" if n == at else "" if field.stated else "faint"
        line += [(" ", ""), (text, role)]
    return line


def _aligned(text: str, width: int, left_aligned: bool) -> str:
    if len(text) > width:
        return text[: width - 1] + "~"
    return text.ljust(width) if left_aligned else text.rjust(width)


def _with_more(line: StyledLine, above: int, below: int, width: int) -> StyledLine:
    """Say at the right of the conditions how many rows are out of sight."""
    if not above and not below:
        return line
    room = width - sum(len(text) for text, _ in line)
    full = ", ".join(f"{n} {word}" for n, word in ((above, "above"), (below, "below")) if n)
    short = " ".join(f"{sign}{n}" for n, sign in ((above, "^"), (below, "v")) if n)
    text = full if len(full) < room else short
    return [*line, (text.rjust(room), "faint")] if len(text) < room else line


def _fitted(line: StyledLine, width: int) -> StyledLine:
    fitted: StyledLine = []
    room = width
    for text, role in line:
        if room <= 0:
            break
        fitted.append((text[:room], role))
        room -= len(text)
    return fitted
