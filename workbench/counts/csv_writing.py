"""Histogram tables as CSV text, read back digit for digit."""

from __future__ import annotations

import csv
import io

from workbench.counts.places import number_text
from workbench.counts.table import BIN_COLUMNS, ERROR_ENDING, Table


def csv_text(table: Table) -> str:
    """Return a table as the CSV text that `read_csv_table` reads.

    Args:
        table: bins, counts, templates and their errors.

    Returns:
        A line of column names and one line a bin; each template is followed by its errors.

    Source:
        none, definition
    """
    columns = {"low": table.binning.low, "high": table.binning.high}
    if table.observed is not None:
        columns[BIN_COLUMNS[2]] = table.observed
    for name, values in table.columns.items():
        columns[name] = values
        if name in table.errors:
            columns[name + ERROR_ENDING] = table.errors[name]
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows([number_text(value) for value in row] for row in zip(*columns.values(), strict=True))
    return stream.getvalue()
