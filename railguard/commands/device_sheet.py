"""The figures of one device as a table on the terminal."""

from rich.markup import escape
from rich.table import Table

from railguard.devices.describe import rows
from railguard.devices.model import Device


def figures(device: Device) -> Table:
    """Return one row per figure: typical, guaranteed, hot, and where it holds."""
    table = Table(box=None, pad_edge=False, header_style="bold")
    table.add_column("", overflow="fold")
    for heading in ("typical", "guaranteed", "hot"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("at", overflow="fold")
    for row in rows(device):
        table.add_row(row.label, row.typical, row.guaranteed, row.hot, escape(row.condition))
    return table
