"""Rewrite what the README shows of railguard's own output; `python tests/write_readme.py`.

The table of rules, the pasted report and the pictures under `.pictures/` come from the commands a
user would give. `tests/test_readme.py` holds the texts and the terminal's picture to them; the
page's picture needs Chromium and is made anew by this script only.
"""

import os
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).parents[1]
PICTURES = ROOT / ".pictures"
SHOWN = "fixtures/faults/headroom-output.cir"
"""The netlist whose report the README shows."""

DAY = "2027-01-31"
"""The day of its review, so that a picture made tomorrow is the same."""

WIDTH, HEIGHT = 1120, 1440
"""Pixels of the page's picture."""


def command(*arguments):
    """Return what a command of railguard prints, given at the top of the tree."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONIOENCODING": "utf-8"}
    called = [sys.executable, "-m", "railguard", *arguments]
    done = subprocess.run(called, cwd=ROOT, env=environment, capture_output=True, check=False)
    assert done.returncode in (0, 1), done.stderr.decode()
    return done.stdout.decode()


def between(text, start, end, new):
    """Return the text with what stands between two marks replaced."""
    before, rest = text.split(start, 1)
    return before + start + new + end + rest.split(end, 1)[1]


def rewritten(text):
    """Return the README's text with its generated parts as they are today."""
    rules = command("rules", "--markdown")
    text = between(text, "<!-- rules -->\n", "<!-- /rules -->", rules)
    report = command("review", SHOWN)
    return between(text, f"$ railguard review {SHOWN}\n", "```", report)


def terminal_picture():
    """Return the terminal's report as an SVG picture."""
    return command("review", SHOWN, "--as-of", DAY, "--report", "svg")


def page_picture(place):
    """Draw the HTML page in headless Chromium; False where there is none."""
    browser = shutil.which("chromium") or shutil.which("chromium-browser")
    if browser is None:
        return False
    with tempfile.TemporaryDirectory() as folder:
        page = Path(folder) / "review.html"
        command("review", SHOWN, "--as-of", DAY, "--report", f"html={page}")
        switches = (
            "--headless --no-sandbox --disable-gpu --disable-quic --no-first-run "
            "--disable-background-networking --disable-component-update --disable-sync "
            f"--hide-scrollbars --window-size={WIDTH},{HEIGHT} --user-data-dir={folder}/profile"
        )
        subprocess.run(
            [browser, *switches.split(), f"--screenshot={place}", page.as_uri()],
            check=True,
            capture_output=True,
            timeout=120,
        )
    return True


def main():
    """Rewrite the README and its pictures."""
    readme = ROOT / "README.md"
    readme.write_text(rewritten(readme.read_text(encoding="utf-8")), encoding="utf-8")
    PICTURES.mkdir(exist_ok=True)
    (PICTURES / "terminal.svg").write_text(terminal_picture(), encoding="utf-8")
    if not page_picture(PICTURES / "page.png"):
        sys.stderr.write("Chromium is not here: .pictures/page.png stays as it was.\n")


if __name__ == "__main__":
    main()
