"""The HTML page: whole, escaped, self-contained, and saying what the review says."""

import base64
import hashlib
import re
from functools import cache
from html.parser import HTMLParser
from pathlib import Path

import pytest

from railguard.report.formats import render
from railguard.report.html.document import TEMPLATES
from railguard.report.html.view import MOST_DRAWN
from railguard.reviewing import review

ROOT = Path(__file__).parents[3]
STATION = ROOT / "fixtures" / "station" / "station.cir"
FAULTS = sorted((ROOT / "fixtures" / "faults").glob("*.cir"))
SOUND = sorted((ROOT / "fixtures" / "sound").glob("*.cir"))
FAULTY = ROOT / "fixtures" / "faults" / "headroom-output.cir"

PARTLY = """gauge with cards that cannot be read
VP vp 0 12
VN vn 0 -12
R1 in n 10k
R2 n out
?? what is this
XU1 0 n vp vn out TL072
XU2 in x vp vn x2 NOBODYS9
.include nowhere.lib
.end
"""

HOSTILE = """<script>alert(1)</script> & "quotes" ' {{ 7*7 }} {% raw %} \u202e title
* </code></td></tr><img src=x onerror=alert(2)>
* railguard: waive drive-current XU1 "<b>lamp</b> test & 'more' only" until=2099-01-01
VIN a<b>&amp;"'> 0 SIN(0 9 1k)
XU1 a<b>&amp;"'> o\u202eut vp vn o\u202eut TL072
R"><svg/onload=alert(3)> o\u202eut javascript:alert(4) 100
Ronclick=alert(5) javascript:alert(4) 0 100
C{{7*7}} o\u202eut 0 10n
XU3 a<b>&amp;"'> n3<!-- vp vn out3]]> </script><script>alert(6)</script>
R9 n3<!-- out3]]> 10k
VP vp 0 12
VN vn 0 -12
.end
"""

VOID = {"meta", "br", "input", "img", "link", "hr"}


class Tree(HTMLParser):
    """Reads a page and holds it to its form: every tag closed, every id once, links that lead."""

    def __init__(self):
        super().__init__(convert_charrefs=True)
        self.stack, self.faults, self.ids, self.links = [], [], [], []
        self.tags, self.texts, self.attributes = [], [], []

    def handle_starttag(self, tag, attrs):
        """Note a tag, its attributes, and that it is open."""
        self.tags.append(tag)
        self.attributes += [(tag, name, value or "") for name, value in attrs]
        named = dict(attrs)
        if "id" in named:
            self.ids.append(named["id"])
        if "href" in named:
            self.links.append(named["href"])
        if tag not in VOID:
            self.stack.append(tag)

    def handle_startendtag(self, tag, attrs):
        """Note a tag that closes itself."""
        self.handle_starttag(tag, attrs)
        if tag not in VOID:
            self.stack.pop()

    def handle_endtag(self, tag):
        """Close the innermost tag, or note a fault."""
        if not self.stack or self.stack.pop() != tag:
            self.faults.append(f"</{tag}> at {self.getpos()}")

    def handle_data(self, data):
        """Note a text."""
        self.texts.append(data)


def page_of(source):
    """Return the page of a review as text."""
    return _page_of(tuple(source) if isinstance(source, list) else source)


@cache
def _page_of(source):
    return render("html", review(source)).decode()


def read(text):
    """Return the page's tree, which is well formed."""
    tree = Tree()
    tree.feed(text)
    tree.close()
    assert tree.faults == []
    assert tree.stack == []
    return tree


def shown(text):
    """Return what a reader sees, on one line, with plain blanks."""
    return " ".join(" ".join(read(text).texts).replace("\u00a0", " ").split())


SOURCES = {
    "sound": STATION,
    "faulty": FAULTY,
    "partly unreadable": PARTLY,
    "empty": "\n\n",
    "no op-amp": "divider\nV1 a 0 5\nR1 a b 1k\nR2 b 0 1k\n.end\n",
    "missing": ROOT / "nowhere.cir",
    "hostile": HOSTILE,
    "several": [FAULTY, STATION, ROOT / "nowhere.cir"],
}


@pytest.mark.parametrize("source", SOURCES.values(), ids=SOURCES)
def test_page_is_whole(source):
    """Tags close, ids stand once, every link leads to a place on the page."""
    tree = read(page_of(source))
    assert len(tree.ids) == len(set(tree.ids))
    assert {link[1:] for link in tree.links} <= set(tree.ids)


@pytest.mark.parametrize("path", SOUND[::3], ids=lambda p: p.stem)
def test_every_topology_makes_a_page(path):
    """No topology and no element stops the page; the verdict is the review's."""
    found = review(path)
    text = render("html", found).decode()
    read(text)
    assert f"Verdict: {found.designs[0].verdict}" in shown(text)


@pytest.mark.parametrize("source", SOURCES.values(), ids=SOURCES)
def test_page_fetches_nothing(source):
    """It is read from disk, by e-mail and in ten years: nothing comes from elsewhere."""
    text = page_of(source)
    tree = read(text)
    assert all(link.startswith("#") for link in tree.links)
    assert {name for _, name, _ in tree.attributes} & {"src", "srcset", "action", "data"} == set()
    assert not {"img", "iframe", "object", "embed", "link", "base"} & set(tree.tags)
    style = (TEMPLATES / "page.css").read_text()
    assert re.findall(r"url\(([^)]*)\)", style) == ["#typical", "#ruled", "#beyond"]
    assert "@import" not in style
    assert "@font-face" not in style


def test_policy_lets_only_the_pages_own_script_and_style_run():
    """The digests in the policy are those of what stands on the page, and there is one of each."""
    text = page_of(HOSTILE)
    (policy,) = re.findall(r'Content-Security-Policy" content="([^"]*)"', text)
    assert "default-src 'none'" in policy
    for tag in ("script", "style"):
        (inside,) = re.findall(rf"<{tag}>(.*?)</{tag}>", text, re.DOTALL)
        digest = base64.b64encode(hashlib.sha256(inside.encode()).digest()).decode()
        assert f"{tag}-src 'sha256-{digest}'" in policy
    assert "unsafe" not in policy


def test_hostile_names_stay_text():
    """Tags, attributes, entities, templates and bidirectional marks of a netlist are shown."""
    text = page_of(HOSTILE)
    tree = read(text)
    assert tree.tags.count("script") == 1
    assert "img" not in tree.tags
    assert not [name for _, name, _ in tree.attributes if name.startswith("on")]
    assert not [value for _, _, value in tree.attributes if value.startswith("javascript:")]
    assert "\u202e" not in text
    seen = "".join(tree.texts)
    for words in (
        "<script>alert(1)</script>", "onerror=alert(2)", "{{ 7*7 }}", "{% raw %}", "<U+202E>",
        "javascript:alert(4)", "&amp;\"'>", "n3<!--", "out3]]>",
    ):  # fmt: skip
        assert words in seen, words


def test_no_style_or_handler_stands_in_an_attribute():
    """The policy would drop them, and drawings must not depend on what is dropped."""
    tree = read(page_of([*FAULTS[:3], STATION]))
    assert not [entry for entry in tree.attributes if entry[1] == "style" or entry[1][:2] == "on"]


def test_findings_stand_with_numbers_source_and_remedy():
    """What the terminal says of the worst finding stands on the page too."""
    found = review(FAULTY).designs[0].findings[0]
    seen = shown(page_of(FAULTY))
    for words in (found.severity, found.rule, found.message, found.remedy, found.source):
        assert words in seen
    assert "Demand 13.1 V Limit 5 V Margin -8.1 V" in seen


def test_findings_stand_beside_their_lines():
    """The row of the netlist's line links to its finding, and the finding to the row."""
    found = review(FAULTY).designs[0].findings[0]
    text = page_of(FAULTY)
    (row,) = re.findall(rf'<tr id="d1-l1-{found.location.line}".*?</tr>', text, re.DOTALL)
    card = FAULTY.read_text().splitlines()[found.location.line - 1]
    assert card.split()[0] in row
    assert "headroom-output" in row
    assert 'href="#d1-f1"' in row or 'href="#d1-f2"' in row
    assert f'href="#d1-l1-{found.location.line}"' in text


def test_not_checked_is_listed_with_what_to_add():
    """Nothing is skipped in silence."""
    found = review(ROOT / "fixtures" / "faults" / "supply-missing.cir")
    seen = shown(render("html", found).decode())
    assert found.designs[0].not_checked
    for note in found.designs[0].not_checked:
        assert note.rule in seen
        assert note.why in seen
    assert '[nets] "vpq" = { volts = ... }' in seen


def test_loop_is_drawn_only_where_it_is_at_issue():
    """A feedback network that shifts the loop's phase shows its curve; a sound stage does not."""
    assert 'class="bode"' in page_of(ROOT / "fixtures" / "faults" / "feedback-high.cir")
    assert 'class="bode"' not in page_of(STATION)


def test_many_netlists_are_a_table_first_and_drawings_only_of_the_worst(tmp_path):
    """Two hundred netlists stay a page that opens: drawings and netlists of the worst twelve."""
    text = FAULTY.read_text()
    paths = []
    for number in range(40):
        path = tmp_path / f"gauge{number:03}.cir"
        path.write_text(text if number % 2 else "x\nV1 a 0 1\nR1 a 0 1k\n.end\n")
        paths.append(path)
    found = page_of(paths)
    tree = read(found)
    assert found.count('<details class="listing"') == 12
    assert "of the other 28 the findings alone" in shown(found)
    assert tree.links.index("#d40") < tree.links.index("#d1-l1-75")


def test_a_netlist_of_many_stages_draws_those_with_a_finding():
    """A page of a thousand drawings would not open; what is left out is said."""
    cells = "".join(
        f"R{n}A i{n} n{n} 10k\nR{n}B n{n} o{n} 10k\nXU{n} 0 n{n} vp vn o{n} TL072\nV{n} i{n} 0 "
        f"SIN(0 {20 if n == 5 else 1} 100)\n"
        for n in range(1, MOST_DRAWN + 2)
    )
    supply = "VP vp 0 12\nVN vn 0 -12\n* railguard: kind bench\n.end\n"
    text = page_of(f"many\n{cells}{supply}")
    assert text.count('class="drawing"') == 1
    assert "R5B" in text.split('class="drawing"')[1].split("</svg>")[0]
    assert f"more than {MOST_DRAWN} stages" in shown(text)
