"""A review in a notebook."""

import subprocess
import sys
from pathlib import Path

from railguard.report.terminal import terminal
from railguard.reviewing import review
from tests.report.html.test_document import FAULTY, HOSTILE, ROOT, STATION, read, shown


def bundle(source):
    """Return what a notebook is given."""
    return review(source)._repr_mimebundle_()


def test_notebook_gets_a_picture_and_a_text():
    """What cannot show HTML shows the terminal's report."""
    found = bundle(FAULTY)
    assert set(found) == {"text/html", "text/plain"}
    assert found["text/plain"] == terminal(review(FAULTY), None).decode()
    worst = review(FAULTY).designs[0].findings[0]
    assert worst.message in shown(found["text/html"])
    assert worst.remedy in shown(found["text/html"])


def test_fragment_is_whole_and_leads_only_to_itself():
    """One element with its own style, no script, every link to an id of its own."""
    for source in (FAULTY, STATION, HOSTILE, "\n", [FAULTY, ROOT / "nowhere.cir"]):
        text = bundle(source)["text/html"]
        tree = read(text)
        assert text.strip().startswith("<div")
        assert text.strip().endswith("</div>")
        assert "script" not in tree.tags
        assert len(tree.ids) == len(set(tree.ids))
        assert {link.removeprefix("#") for link in tree.links} <= set(tree.ids)


def test_two_reviews_share_no_anchor():
    """Outputs of two cells stand on one page."""
    first, second = (read(bundle(source)["text/html"]) for source in (FAULTY, STATION))
    marks = {"beyond", "ruled", "typical"}  # patterns, the same in both
    assert set(first.ids) & set(second.ids) == marks


def test_reports_are_not_imported_before_a_notebook_asks():
    """A review costs no templates and no drawings."""
    code = (
        "import sys; from railguard.reviewing import review; "
        f"review({str(Path(STATION))!r}); "
        "assert not [m for m in sys.modules if m.startswith(('railguard.report', 'jinja2'))]"
    )
    subprocess.run([sys.executable, "-c", code], check=True, cwd=ROOT)
