"""The JUnit XML report: suites, cases, and what fails a build."""

from xml.etree import ElementTree as Xml

import junitparser
import pytest

from railguard.report.as_junit import document
from railguard.reviewing import review
from tests.report import designs


def suites(data):
    """Return the suites of a report as a reader of another house sees them."""
    return list(junitparser.JUnitXml.fromstring(data))


def cases_of(found, root=None):
    """Return the cases of a report by name."""
    return {c.get("name"): c for c in Xml.fromstring(document(found, root)).iter("testcase")}


@pytest.mark.parametrize("name", designs.KINDS)
def test_counts_are_those_of_the_cases(name, report):
    """Every suite and the whole count what they hold, as another reader counts it too."""
    top = Xml.fromstring(report("junit", name))
    for holder in (top, *top.iter("testsuite")):
        cases = list(holder.iter("testcase"))
        assert int(holder.get("tests")) == len(cases)
        assert int(holder.get("failures")) == sum(c.find("failure") is not None for c in cases)
        assert int(holder.get("skipped")) == sum(c.find("skipped") is not None for c in cases)
    for suite in suites(report("junit", name)):
        counted = (suite.tests, suite.failures, suite.skipped, suite.errors)
        suite.update_statistics()
        assert counted == (suite.tests, suite.failures, suite.skipped, suite.errors)


@pytest.mark.parametrize("name", designs.KINDS)
def test_a_suite_fails_where_its_netlist_is_on_hold(name, reviewed, report):
    """A failure and a hold are the same thing."""
    found = reviewed(name)[0]
    top = Xml.fromstring(report("junit", name))
    failing = [int(suite.get("failures")) > 0 for suite in top]
    assert failing[: len(found.designs)] == [d.verdict == "hold" for d in found.designs]


@pytest.mark.parametrize("name", designs.KINDS)
def test_no_case_stands_twice(name, report):
    """Readers that take the first of two alike would lose the second."""
    for suite in Xml.fromstring(report("junit", name)):
        names = [(c.get("classname"), c.get("name")) for c in suite.iter("testcase")]
        assert len(set(names)) == len(names)


def test_a_case_is_a_rule_and_its_subject(reviewed, report):
    """Every judgement is there, those that passed too."""
    found = reviewed("faulty")[0].designs[0]
    cases = {c.get("name"): c for c in Xml.fromstring(report("junit", "faulty")).iter("testcase")}
    assert len(cases) == found.judged
    failing = [name for name, c in cases.items() if c.find("failure") is not None]
    assert failing == ["headroom-output XU5A"]
    case = cases["headroom-output XU5A"]
    assert case.get("classname") == case.get("file") == "headroom-output.cir"
    assert case.get("line") == str(found.findings[0].location.line)
    assert case.find("failure").get("message") == found.findings[0].message
    assert case.find("failure").get("type") == "critical"
    assert found.findings[0].remedy in case.find("failure").text
    assert list(cases["headroom-output XU1"]) == []


def test_what_was_not_checked_is_skipped(reviewed, report):
    """With the reason, and what to state to get it."""
    notes = reviewed("partly")[0].designs[0].not_checked
    cases = {c.get("name"): c for c in Xml.fromstring(report("junit", "partly")).iter("testcase")}
    for note in notes:
        case = cases[f"{note.rule} {note.subject}"]
        assert note.why in case.find("skipped").text
        assert note.add in case.find("skipped").text


def test_what_stands_below_the_hold_level_passes(reviewed, report):
    """A minor finding is written into a case that passes."""
    cases = {c.get("name"): c for c in Xml.fromstring(report("junit", "waived")).iter("testcase")}
    case = cases["headroom-output XU1"]
    assert case.find("failure") is None
    assert case.find("system-out").text.startswith("minor: ")


def test_a_waived_finding_passes_and_says_so(report):
    """Its case holds the finding and the waiver."""
    cases = {c.get("name"): c for c in Xml.fromstring(report("junit", "waived")).iter("testcase")}
    case = cases["drive-current XU1"]
    assert case.find("failure") is None
    assert "line test only, 10 ms by hardware lead until 2027-06-30" in case.find("system-out").text


def test_the_hold_level_is_the_users():
    """At remark everything fails, at critical the major finding does not."""
    text = designs.GAUGE.format(peak=0.5, load=600)
    failing = {
        level: [
            n
            for n, c in cases_of(review(text, changes={"hold_at": level})).items()
            if c.find("failure") is not None
        ]
        for level in ("critical", "major", "remark")
    }
    assert failing["critical"] == []
    assert failing["major"] == ["drive-current XU1"]
    assert len(failing["remark"]) > 1


def test_a_required_family_that_stays_open_fails():
    """What the user requires and could not be checked holds the build up."""
    text = designs.GAUGE.format(peak=0.1, load=10_000).replace("TL072", "NOBODYKNOWS77")
    plain = cases_of(review(text))
    asked = cases_of(review(text, changes={"require": ("stability",)}))
    opened = [n for n, c in plain.items() if c.find("skipped") is not None and "stability" in n]
    assert opened
    for name in opened:
        assert asked[name].find("failure").get("type") == "open"
        assert asked[name].find("skipped") is None


def test_what_follows_fails_beside_its_cause(reviewed, report):
    """A consequence is a case of its own that names the cause."""
    findings = reviewed("partly")[0].designs[0].findings
    cause = next(f for f in findings if f.consequences)
    inner = cause.consequences[0]
    text = Xml.fromstring(report("junit", "partly"))
    told = [
        c.find("failure").text
        for c in text.iter("testcase")
        if c.get("name").startswith(inner.rule) and c.find("failure") is not None
    ]
    assert any(f"It follows from {cause.rule}: {cause.message}" in t for t in told)


def test_stale_waivers_are_a_suite_of_their_own(tmp_path):
    """What concerns the run itself fails nothing and is not lost."""
    (tmp_path / "railguard.toml").write_text(designs.WAIVER)
    (tmp_path / "gauge.cir").write_text(designs.GAUGE.format(peak=0.1, load=10_000))
    top = Xml.fromstring(document(review(tmp_path / "gauge.cir", as_of=designs.DAY), tmp_path))
    assert [suite.get("name") for suite in top] == ["gauge.cir", "The run as a whole"]
    assert "matches no finding" in top[1][0].find("system-out").text


def test_the_report_stays_below_what_readers_take(report):
    """GitLab's documented bound is 30 MB a file; two hundred netlists are far below it."""
    assert len(report("junit", "many")) < 3_000_000
    assert report("junit", "many").startswith(b"<?xml")
