"""The SARIF report: its schema, its places, its fingerprints, waivers and rules."""

import json
import re

import jsonschema
import msgspec
import pytest

from railguard.deck.bounds import Bounds
from railguard.location import Location
from railguard.report.as_sarif import FINGERPRINT, document, region
from railguard.reviewing import review
from railguard.rules import third_party
from railguard.rules.finding import Finding
from railguard.rules.protocol import Limit, Rule
from tests.report import designs
from tests.report.standards import sarif_schema


def run_of(found, root=None):
    """Return the one run of a SARIF report."""
    (run,) = json.loads(document(found, root))["runs"]
    return run


def run_in(folder, text, name="gauge.cir", encoding="utf-8"):
    """Return the run of a netlist laid into a folder."""
    (folder / name).write_bytes(text.encode(encoding))
    return run_of(review(folder / name, as_of=designs.DAY), folder)


@pytest.fixture(scope="module")
def validator():
    """Return what holds a report to the published schema."""
    schema = sarif_schema()
    made = jsonschema.validators.validator_for(schema)
    made.check_schema(schema)
    return made(schema, format_checker=made.FORMAT_CHECKER)


@pytest.mark.parametrize("name", designs.KINDS)
def test_reports_obey_the_published_schema(name, report, validator):
    """OASIS SARIF 2.1.0 errata 01, as a package of the registry carries its schema."""
    validator.validate(json.loads(report("sarif", name)))


def test_schema_refuses_what_is_no_report(report, validator):
    """A level the standard does not know is refused: the check itself can fail."""
    wrong = json.loads(report("sarif", "faulty"))
    wrong["runs"][0]["results"][0]["level"] = "critical"
    with pytest.raises(jsonschema.ValidationError):
        validator.validate(wrong)


def test_schema_is_that_of_the_errata(report, validator):
    """A region without a beginning, which only errata 01 refuses."""
    wrong = json.loads(report("sarif", "faulty"))
    place = wrong["runs"][0]["results"][0]["locations"][0]["physicalLocation"]
    place["region"] = {"endLine": 3}
    with pytest.raises(jsonschema.ValidationError):
        validator.validate(wrong)


def test_a_finding_is_a_result_at_its_line(reviewed, report):
    """Rule, level, place, message with remedy, numbers."""
    (finding,) = reviewed("faulty")[0].designs[0].findings
    run = json.loads(report("sarif", "faulty"))["runs"][0]
    (result,) = run["results"]
    assert result["ruleId"] == "headroom-output"
    assert run["tool"]["driver"]["rules"][result["ruleIndex"]]["id"] == "headroom-output"
    assert result["level"] == "error"
    assert finding.message in result["message"]["text"]
    assert finding.remedy in result["message"]["text"]
    (place,) = result["locations"]
    assert place["physicalLocation"]["artifactLocation"] == {
        "uri": "headroom-output.cir",
        "uriBaseId": "SRCROOT",
        "index": 0,
    }
    assert place["physicalLocation"]["region"]["startLine"] == finding.location.line
    assert [p["name"] for p in place["logicalLocations"]] == ["XU5A", "o6"]
    assert result["properties"]["margin"] == finding.margin
    assert result["properties"]["severity"] == "critical"


def test_levels_follow_the_severities(reviewed, report):
    """Critical and major are errors, minor warnings, remarks notes."""
    findings = reviewed("partly")[0].designs[0].findings
    results = json.loads(report("sarif", "partly"))["runs"][0]["results"]
    wanted = {"critical": "error", "major": "error", "minor": "warning", "remark": "note"}
    assert [r["level"] for r in results] == [wanted[f.severity] for f in findings]
    assert {f.severity for f in findings} == set(wanted)


def test_what_follows_hangs_on_its_cause(reviewed, report):
    """A consequence is a related place with its own sentence, and no result of its own."""
    findings = reviewed("partly")[0].designs[0].findings
    results = json.loads(report("sarif", "partly"))["runs"][0]["results"]
    index = next(i for i, f in enumerate(findings) if f.consequences)
    related = results[index]["relatedLocations"]
    assert len(related) == len(findings[index].consequences)
    assert findings[index].consequences[0].message in related[0]["message"]["text"]
    assert len(results) == len(findings)


ASTRAL = "\U0001d7d9"
"""One character, and two units of UTF-16."""


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
def test_columns_count_characters(tmp_path, encoding):
    """A region covers the very characters of its line, whatever stands before them."""
    text = designs.GAUGE.format(peak=0.5, load="1M").replace(
        "RL out 0", f"RL_{ASTRAL}Ω out\u00b5 0"
    )
    text = text.replace("XU1 0 n vp vn out", "XU1 0 n vp vn out\u00b5").replace(
        "R2 n out", "R2 n out\u00b5"
    )
    run = run_in(tmp_path, text, encoding=encoding)
    assert run["columnKind"] == "unicodeCodePoints"
    (result,) = [r for r in run["results"] if r["ruleId"] == "netlist-value-suffix"]
    place = result["locations"][0]["physicalLocation"]["region"]
    line = text.splitlines()[place["startLine"] - 1]
    assert line[place["startColumn"] - 1 : place["endColumn"] - 1] == "1M"
    in_units = len(line[: place["startColumn"] - 1].encode("utf-16-le")) // 2 + 1
    assert place["startColumn"] == in_units - 1


def test_columns_of_an_old_code_page_count_characters(tmp_path):
    """A byte of Windows-1252 is one character."""
    text = designs.GAUGE.format(peak=0.5, load="1M").replace("out", "out\u00b5")
    run = run_in(tmp_path, text, encoding="cp1252")
    (result,) = [r for r in run["results"] if r["ruleId"] == "netlist-value-suffix"]
    place = result["locations"][0]["physicalLocation"]["region"]
    line = text.splitlines()[place["startLine"] - 1]
    assert line[place["startColumn"] - 1 : place["endColumn"] - 1] == "1M"


def test_regions_stay_on_their_line(tmp_path):
    """A card over three lines is marked on its first one only."""
    text = designs.GAUGE.format(peak=0.5, load=600).replace(
        "XU1 0 n vp vn out TL072", "  XU1 0 n\n+ vp vn\n+ out TL072"
    )
    run = run_in(tmp_path, text)
    (result,) = [r for r in run["results"] if r["ruleId"] == "drive-current"]
    place = result["locations"][0]["physicalLocation"]["region"]
    assert place == {"startLine": 6, "startColumn": 3, "endColumn": 10}


@pytest.mark.parametrize("name", ["faulty", "partly", "hostile", "many"])
def test_regions_lie_within_their_lines(name, reviewed, report):
    """No region begins or ends beyond the text it is about."""
    root = reviewed(name)[1]
    for run in json.loads(report("sarif", name))["runs"]:
        files = [a["location"]["uri"] for a in run["artifacts"]]
        texts = [lines_of(root, uri) for uri in files]
        for result in run["results"]:
            at = result["locations"][0]["physicalLocation"]
            place = at.get("region", {})
            if "startColumn" in place:
                line = texts[at["artifactLocation"]["index"]][place["startLine"] - 1]
                assert 1 <= place["startColumn"] < place["endColumn"] <= len(line) + 1


def lines_of(root, uri):
    """Return the lines of a file by its relative address."""
    from urllib.parse import unquote

    text = (root / unquote(uri)).read_bytes().decode()
    return re.split(r"\r\n|\n|\r", text)


def test_a_place_of_no_length_is_a_line_or_a_character():
    """A point on a line is one character; the first column alone is the whole line."""
    assert region(Location("a", 3)).start_column is None
    assert (region(Location("a", 3, 5)).start_column, region(Location("a", 3, 5)).end_column) == (
        5,
        6,
    )
    assert region(Location("a", 0)) is None


def test_fingerprints_forget_lines_and_values(tmp_path):
    """A comment above and another load leave them as they were; another netlist does not."""
    text = designs.GAUGE.format(peak=0.5, load=600)
    moved = text.replace("RL out 0 600", "* heavier\nRL out 0 590")

    def prints(run):
        return [
            r["partialFingerprints"][FINGERPRINT]
            for r in run["results"]
            if r["ruleId"] == "drive-current"
        ]

    before = prints(run_in(tmp_path, text))
    assert len(before) == 1
    assert before == prints(run_in(tmp_path, moved))
    assert before != prints(run_in(tmp_path, text, name="other.cir"))


@pytest.mark.parametrize("name", designs.KINDS)
def test_fingerprints_tell_results_apart(name, report):
    """No two results of one run share one."""
    results = json.loads(report("sarif", name))["runs"][0]["results"]
    prints = [r["partialFingerprints"][FINGERPRINT] for r in results]
    assert len(set(prints)) == len(prints)


def test_a_waiver_is_a_suppression(report):
    """With its reason, by whom and until when; what is not waived has none."""
    results = json.loads(report("sarif", "waived"))["runs"][0]["results"]
    waived = [r for r in results if "suppressions" in r]
    assert [r["ruleId"] for r in waived] == ["drive-current"]
    (note,) = waived[0]["suppressions"]
    assert note["kind"] == "external"
    assert note["status"] == "accepted"
    assert note["justification"] == "line test only, 10 ms"
    assert note["properties"] == {"by": "hardware lead", "until": "2027-06-30"}
    assert note["location"]["physicalLocation"]["artifactLocation"]["uri"] == "railguard.toml"
    assert len(results) > 1


def test_a_waiver_in_the_netlist_is_in_the_source(tmp_path):
    """A comment card accepts within the very file."""
    text = designs.GAUGE.format(peak=0.5, load=600).replace(
        ".end", '* railguard: waive drive-current XU1 "line test only"\n.end'
    )
    waived = [r for r in run_in(tmp_path, text)["results"] if "suppressions" in r]
    assert [r["suppressions"][0]["kind"] for r in waived] == ["inSource"]


def test_what_could_not_be_read_or_judged_is_told_apart(report):
    """Notifications of the run, each with its place; the reading goes on, so none is an error."""
    (call,) = json.loads(report("sarif", "partly"))["runs"][0]["invocations"]
    assert call["executionSuccessful"]
    told = call["toolExecutionNotifications"]
    by_kind = {
        kind: [n for n in told if n["descriptor"]["id"] == kind]
        for kind in ("not-read", "not-checked", "read-as")
    }
    assert any("lost.inc" in n["message"]["text"] for n in by_kind["not-read"])
    assert {n["level"] for n in by_kind["not-read"]} == {"warning"}
    assert by_kind["not-read"][0]["associatedRule"]["id"] == "netlist-include"
    assert by_kind["not-read"][0]["locations"][0]["physicalLocation"]["region"]["startLine"] == 2
    assert any("NOBODYKNOWS77" in n["message"]["text"] for n in by_kind["not-checked"])
    assert len(by_kind["not-checked"]) + len(by_kind["not-read"]) + len(by_kind["read-as"]) == len(
        told
    )


@pytest.mark.parametrize("name", ["empty", "missing"])
def test_a_file_that_cannot_be_read_is_an_error_of_the_run(name, report):
    """A host then knows that the list of results is not complete."""
    (call,) = json.loads(report("sarif", name))["runs"][0]["invocations"]
    assert [n["level"] for n in call["toolExecutionNotifications"]] == ["error"]


def test_addresses_are_relative_and_quoted(report):
    """Nothing of the machine's folders is written, and no name breaks an address."""
    run = json.loads(report("sarif", "hostile"))["runs"][0]
    uris = [a["location"]["uri"] for a in run["artifacts"]]
    assert len(uris) == len(designs.NAMES)
    assert all(re.fullmatch(r"[A-Za-z0-9._~%/-]+", uri) for uri in uris)
    assert run["originalUriBaseIds"]["SRCROOT"].keys() == {"description"}
    assert {a["location"]["uriBaseId"] for a in run["artifacts"]} == {"SRCROOT"}


def test_a_file_outside_the_root_has_a_whole_address(tmp_path):
    """It cannot be relative to a root it does not lie below."""
    (tmp_path / "in").mkdir()
    (tmp_path / "gauge.cir").write_text(designs.GAUGE.format(peak=0.5, load=600))
    run = run_of(review(tmp_path / "gauge.cir"), tmp_path / "in")
    location = run["artifacts"][0]["location"]
    assert location == {"uri": (tmp_path / "gauge.cir").resolve().as_uri()}


def test_a_netlist_that_came_as_text_has_no_address():
    """Its findings name elements and nets, and no file."""
    run = run_of(review(designs.GAUGE.format(peak=0.5, load=600)))
    assert run["artifacts"] == []
    assert all("physicalLocation" not in r["locations"][0] for r in run["results"])
    assert run["results"][0]["locations"][0]["logicalLocations"]


def test_every_file_read_is_an_artifact(tmp_path):
    """Includes stand behind the netlist; findings in them point at them."""
    (tmp_path / "load.inc").write_text("RL out 0 1M\n")
    text = designs.GAUGE.format(peak=0.5, load=600).replace("RL out 0 600", ".include load.inc")
    run = run_in(tmp_path, text)
    assert [(a["location"]["uri"], a.get("roles")) for a in run["artifacts"]] == [
        ("gauge.cir", ["analysisTarget"]),
        ("load.inc", None),
    ]
    (result,) = [r for r in run["results"] if r["ruleId"] == "netlist-value-suffix"]
    assert result["locations"][0]["physicalLocation"]["artifactLocation"]["uri"] == "load.inc"


def test_rules_are_described_with_the_limits_used(tmp_path):
    """Reason, source and limits, the user's values in place of the defaults."""
    (tmp_path / "railguard.toml").write_text("[limits.headroom-output]\nreserve-share = 0.07\n")
    run = run_in(tmp_path, designs.GAUGE.format(peak=0.5, load=600))
    rules = {rule["id"]: rule for rule in run["tool"]["driver"]["rules"]}
    assert rules["headroom-output"]["properties"]["limits"] == {"reserve-share": 0.07}
    assert rules["headroom-output"]["properties"]["tags"] == ["headroom"]
    assert "reserve-share 0.07" in rules["headroom-output"]["help"]["text"]
    assert rules["headroom-output"]["fullDescription"]["text"]


def _house_rule(stage, limits, design):
    if limits["most"] < 2:
        yield Finding(
            rule="bias-house",
            family="bias",
            severity="minor",
            designators=(stage.designator,),
            location=stage.location,
            message=f"{stage.schematic} is not on the house list.",
        )


HOUSE_RULE = Rule(
    name="bias-house",
    family="bias",
    looks_at="stage",
    judges="Op-amps that are not on the house list {1}.",
    reason="The house list.",
    source="house list, revision C",
    limits=(Limit("most", 1.0, "", "devices a board", "house list"),),
    judge=_house_rule,
)


def test_rules_of_other_packages_are_described(monkeypatch, validator):
    """They stand behind the house's own, as their author describes them."""
    monkeypatch.setattr(third_party, "installed", lambda: third_party.Installed((HOUSE_RULE,)))
    found = review(designs.GAUGE.format(peak=0.1, load=10_000))
    run = run_of(found)
    *_, house = run["tool"]["driver"]["rules"]
    assert house["id"] == "bias-house"
    assert house["shortDescription"]["text"] == "Op-amps that are not on the house list {{1}}."
    assert house["properties"]["limits"] == {"most": 1.0}
    result = next(r for r in run["results"] if r["ruleId"] == "bias-house")
    assert run["tool"]["driver"]["rules"][result["ruleIndex"]]["id"] == "bias-house"
    validator.validate(json.loads(document(found)))


def test_a_rule_that_is_switched_off_is_not_described(tmp_path):
    """The report lists what ran."""
    (tmp_path / "railguard.toml").write_text('[review]\noff = ["drive-current"]\n')
    run = run_in(tmp_path, designs.GAUGE.format(peak=0.5, load=600))
    assert "drive-current" not in [rule["id"] for rule in run["tool"]["driver"]["rules"]]


def test_stale_waivers_of_the_run_are_results(tmp_path):
    """What concerns the run itself is told too, at the settings file."""
    (tmp_path / "railguard.toml").write_text(designs.WAIVER)
    run = run_in(tmp_path, designs.GAUGE.format(peak=0.1, load=10_000))
    (result,) = [r for r in run["results"] if r["ruleId"] == "netlist-waiver-stale"]
    assert result["locations"][0]["physicalLocation"]["artifactLocation"]["uri"] == "railguard.toml"


def test_a_bound_that_is_passed_is_told(tmp_path):
    """A netlist that was cut short is not taken for a whole one."""
    (tmp_path / "gauge.cir").write_text(designs.GAUGE.format(peak=0.5, load=600))
    found = review(tmp_path / "gauge.cir", bounds=Bounds(file_bytes=10))
    (call,) = run_of(found, tmp_path)["invocations"]
    assert call["toolExecutionNotifications"][0]["descriptor"]["id"] == "not-read"


def mended(text, replacements):
    """Return a text with SARIF replacements made: regions in characters, columns from 1."""
    ends = re.compile(r"\r\n|\n|\r")
    lines = ends.split(text)
    between = [*ends.findall(text), ""]
    for one in sorted(replacements, key=lambda r: -r["deletedRegion"]["startLine"]):
        place, new = one["deletedRegion"], one["insertedContent"]["text"]
        at = place["startLine"] - 1
        line = lines[at]
        lines[at] = line[: place["startColumn"] - 1] + new + line[place["endColumn"] - 1 :]
    return "".join(map("".join, zip(lines, between, strict=True)))


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16"])
@pytest.mark.parametrize("ends", ["\n", "\r\n"], ids=["LF", "CRLF"])
@pytest.mark.parametrize("fault", ["headroom-output", "decoupling-absent"])
def test_a_fix_cures_its_finding(tmp_path, fault, ends, encoding, validator):
    """Made in the file as SARIF says, the change leaves nothing of the finding."""
    source = designs.FIXTURES / "faults" / f"{fault}.cir"
    text = source.read_text(encoding="utf-8").replace("\n", ends)
    text = f"\u00b5{ASTRAL} {text}"
    place = tmp_path / source.name
    place.write_bytes(text.encode(encoding))
    found = review(place)
    validator.validate(json.loads(document(found, tmp_path)))
    (result,) = [r for r in run_of(found, tmp_path)["results"] if r["ruleId"] == fault]
    (fix,) = result["fixes"]
    (change,) = fix["artifactChanges"]
    assert fix["description"]["text"]
    assert change["artifactLocation"]["uri"] == source.name
    better = mended(text, change["replacements"])
    assert better != text
    assert better.count("\r") == (better.count("\n") if ends == "\r\n" else 0)
    place.write_bytes(better.encode(encoding))
    assert fault not in [f.rule for f in review(place).designs[0].findings]


def test_a_run_over_many_netlists_goes_without_fixes(report):
    """And says so."""
    run = json.loads(report("sarif", "many"))["runs"][0]
    assert not any("fixes" in result for result in run["results"])
    assert run["properties"]["fixes"] == "left out: more than 12 netlists"


def test_a_text_without_a_file_has_no_fixes():
    """There is no file they could be made in."""
    run = run_of(review(designs.GAUGE.format(peak=0.5, load=600)))
    assert run["results"]
    assert not any("fixes" in result for result in run["results"])


def test_hostile_messages_hold_no_link_and_no_placeholder():
    """Braces are doubled, and no bracket is followed by a parenthesis."""
    found = review(designs.GAUGE.format(peak=0.5, load=600))
    design = found.designs[0]
    odd = msgspec.structs.replace(
        design.findings[0], message="[click](http://gauge.example) {0} {{1}}", remedy="[a](1)"
    )
    found = msgspec.structs.replace(
        found, designs=(msgspec.structs.replace(design, findings=(odd,)),)
    )
    text = run_of(found)["results"][0]["message"]["text"]
    assert "](" not in text
    assert "{0}" not in text.replace("{{", "").replace("}}", "")
    assert "[click] (http://gauge.example) {{0}} {{{{1}}}}" in text
