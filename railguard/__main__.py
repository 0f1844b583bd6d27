"""Where a run begins: `railguard`, and `python -m railguard`, which is what a git hook runs."""

import os
import sys

from railguard.threads import ONE_THREAD


def main() -> None:
    """Run the command line; a commit that concerns no netlist pays for no import."""
    for name, count in ONE_THREAD.items():
        os.environ.setdefault(name, count)
    if sys.argv[1:3] == ["hook", "run"] and not _concerned():
        return
    from railguard.commands.main import main as command_line

    command_line()


def _concerned() -> bool:
    """Tell whether the command has to be run at all, to say what went wrong if nothing else."""
    from railguard.commands.hook.git import GitError, top_folder
    from railguard.commands.hook.staged import concerned

    if any(not word.startswith("-") or word in ("-h", "--help") for word in sys.argv[3:]):
        return True
    try:
        return concerned(top_folder())
    except GitError:
        return True


if __name__ == "__main__":
    main()
