"""XLSX files that read and print well: text stays text, numbers stay numbers, no cell is a formula."""

from __future__ import annotations

import io
import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from colloc.answers.columns import Columns
from colloc.errors import DataError, MissingExtraError

LONGEST_CELL = 32_767
"""Characters that a cell of the format holds."""
MOST_ROWS = 1_048_575
_WIDEST, _NARROWEST = 60, 6


@dataclass(frozen=True, slots=True)
class Table:
    """One worksheet.

    Parameters
    ----------
    name : str
    columns : Columns
    choices : mapping of str to sequence of str
        Columns whose cells offer a list to choose from.
    open_cells : sequence of str
        Columns to be filled in, shown apart.
    hidden : sequence of str
        Columns that are there for reading back only; shown narrow and grey.
    printed : int
        Only so many columns, the first ones, are printed; 0 for all.
    """

    name: str
    columns: Columns
    choices: Mapping[str, Sequence[str]]
    open_cells: Sequence[str] = ()
    hidden: Sequence[str] = ()
    printed: int = 0


def workbook(tables: Sequence[Table]) -> bytes:
    """An XLSX file with one worksheet for each table.

    Texts are written as texts whatever they begin with, and marked so that editing one does not make a formula of it.

    Raises
    ------
    MissingExtraError
        Where XlsxWriter is not installed.
    DataError
        For a text or a table that the format cannot hold.
    """
    try:
        import xlsxwriter
    except ImportError as error:
        raise MissingExtraError("XLSX needs XlsxWriter: pip install 'colloc[sheets]'") from error
    stream = io.BytesIO()
    options = {
        "in_memory": True,
        "strings_to_formulas": False,
        "strings_to_urls": False,
        "strings_to_numbers": False,
        "nan_inf_to_errors": False,
    }
    book = xlsxwriter.Workbook(stream, options)
    try:
        for table in tables:
            _write(book, table)
    finally:
        book.close()
    return stream.getvalue()


def _write(book: Any, table: Table) -> None:
    answer = table.columns
    if len(answer) > MOST_ROWS:
        raise DataError(f"{len(answer):,} rows: a worksheet holds {MOST_ROWS:,}; write CSV, or fewer rows")
    sheet = book.add_worksheet(table.name)
    common = {"valign": "top", "text_wrap": True}
    head = book.add_format({"bold": True, "bottom": 1, "valign": "top", "text_wrap": True})
    # quote_prefix: the format's own mark for "this is text", so that a cell stays text when it is edited.
    text = book.add_format({**common, "num_format": "@", "quote_prefix": True})
    filled = book.add_format({**common, "num_format": "@", "quote_prefix": True, "bg_color": "#FFF7DD"})
    grey = book.add_format({**common, "num_format": "@", "quote_prefix": True, "font_color": "#808080"})
    whole = book.add_format({"valign": "top", "num_format": "#,##0"})
    broken = book.add_format({"valign": "top", "num_format": "0.0000"})
    for place, name in enumerate(answer.names):
        values = answer[name].tolist()
        numeric = answer.is_numeric(name)
        sheet.write_string(0, place, name, head)
        style = filled if name in table.open_cells else grey if name in table.hidden else text
        sheet.set_column(place, place, _width(name, values, numeric), None if numeric else style)
        for row, value in enumerate(values, 1):
            if numeric:
                _number(sheet, row, place, value, whole if answer[name].dtype.kind in "iu" else broken)
            else:
                _text(sheet, row, place, value, style, f"row {row + 1}, column {name}")
        if name in table.choices and len(answer):
            rule = {"validate": "list", "source": list(table.choices[name]), "ignore_blank": True}
            sheet.data_validation(1, place, len(answer), place, rule)
    last = max(len(answer.names) - 1, 0)
    sheet.freeze_panes(1, 1)
    sheet.autofilter(0, 0, len(answer), last)
    sheet.repeat_rows(0)
    if table.printed:
        sheet.print_area(0, 0, len(answer), table.printed - 1)
    sheet.set_landscape()
    sheet.set_paper(9)
    sheet.fit_to_pages(1, 0)
    sheet.set_footer("&L&F&R&P / &N")


def _number(sheet: Any, row: int, place: int, value: Any, style: Any) -> None:
    """The format has no infinities: they are texts; what is no number stays blank."""
    if math.isfinite(value):
        sheet.write_number(row, place, value, style)
    elif not math.isnan(value):
        sheet.write_string(row, place, "inf" if value > 0 else "-inf", style)


def _text(sheet: Any, row: int, place: int, value: Any, style: Any, where: str) -> None:
    cell = "" if value is None else str(value)
    if len(cell) > LONGEST_CELL:
        raise DataError(f"{where}: {len(cell):,} characters; a cell holds {LONGEST_CELL:,}; write CSV instead")
    if cell:
        sheet.write_string(row, place, cell, style)
    else:
        sheet.write_blank(row, place, None, style)


def _width(name: str, values: Sequence[Any], numeric: bool) -> float:
    if numeric:
        return max(len(name) + 2, 9)
    longest = max((len(str(value)) for value in values[:500] if value), default=0)
    return min(max(longest + 1, len(name) + 2, _NARROWEST), _WIDEST)


def sheet_workbook(answer: Columns) -> bytes:
    """A sheet of candidates to fill in."""
    from colloc.answers.judging.sheets import FILLED

    hidden = [name for name in ("layer", "kind", "judge", "check") if name in answer]
    choices = {"verdict": ("accept", "reject", "unsure", "withdrawn")}
    return workbook([Table("candidates", answer, choices, FILLED, hidden)])
