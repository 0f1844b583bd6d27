"""All measurements in one table, each in a short form of a minute or less.

    python -m tests.bench            everything
    python -m tests.bench review     those whose name holds "review"

Every row says the command of its long form. The machine should have nothing else to do.
"""

import os
import subprocess
import sys
import time
from pathlib import Path

from rich.console import Console
from rich.table import Table
from rich.text import Text

HERE = Path(__file__).parent
ROOT = HERE.parents[1]

SHORT: tuple[tuple[str, str, tuple[str, ...]], ...] = (
    ("review beside its imports", "review_time.py", ()),
    ("reading beside PySpice and ngspice", "reading.py", ()),
    ("analysis by number of sheets", "analysis_time.py", ()),
    ("commits with the hook", "hook_time.py", ()),
    ("audit beside ngspice", "audit_speed.py", ("400", "2")),
    ("audit on a cluster", "audit_cluster.py", ("scale", "200")),
    ("faults found", "recall.py", ("29",)),
    ("false alarms", "quiet.py", ("100",)),
    ("redline", "redline.py", ("58",)),
    ("netlists tried", "fuzzing.py", ("--seconds", "30")),
)
"""What is measured, the script, and the arguments of its short form."""


def main() -> None:
    """Run each script in turn and print its rows beside its name."""
    wanted = sys.argv[1] if len(sys.argv) > 1 else ""
    table = Table("measured", "by", "figures", "seconds", show_lines=True)
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    console = Console()
    for what, script, arguments in SHORT:
        if wanted not in f"{what} {script}":
            continue
        begun = time.monotonic()
        with console.status(what):
            done = subprocess.run(
                [sys.executable, str(HERE / script), *arguments],
                cwd=ROOT,
                env=environment,
                capture_output=True,
                text=True,
                check=False,
            )
        said = done.stdout.strip() or done.stderr.strip().rsplit("\n", 1)[-1]
        table.add_row(what, f"tests/bench/{script}", Text(said), f"{time.monotonic() - begun:.0f}")
    console.print(table)


if __name__ == "__main__":
    main()
