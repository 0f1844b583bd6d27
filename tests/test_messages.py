"""Broken input: a clear message with file and line, never a traceback, the rest reviewed."""

import json
import subprocess
import sys

import pytest

STAGE = """VIN in 0 SIN(0 0.5 1k)
R1 in n 10k
R2 n out 20k
XU1 0 n vp vn out TL072
RL out 0 10k
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
"""


def run(folder, name, data, *more):
    """Write a netlist and review it with the command; return status, report, error text."""
    path = folder / name
    path.write_bytes(data if isinstance(data, bytes) else data.encode())
    return command(folder, name, *more)


def command(folder, name, *more):
    """Run the command in a folder; return status, the design's part of the report, error text."""
    done = subprocess.run(
        [sys.executable, "-m", "railguard", "review", name, "--report", "json", *more],
        cwd=folder,
        capture_output=True,
        text=True,
        timeout=60,
    )
    assert "Traceback" not in done.stderr
    design = json.loads(done.stdout)["designs"][0] if done.stdout else None
    return done.returncode, design, done.stderr


def about(design, rule):
    """Return the findings of one rule."""
    return [f for f in design["findings"] if f["rule"] == rule]


def test_truncated_file_is_reviewed_as_far_as_it_goes(tmp_path):
    """A card cut off in the middle costs that card."""
    _, design, _ = run(tmp_path, "gauge.cir", "station\n" + STAGE + "R9 out")
    (finding,) = about(design, "netlist-node-count")
    assert (finding["file"], finding["line"]) == ("gauge.cir", 11)
    assert "R9" in finding["message"]
    assert design["stages"][0]["output"]["demand_high"] == pytest.approx(1.0, rel=0.01)


def test_binary_file_is_one_finding(tmp_path):
    """A file that is no netlist is refused in one sentence."""
    status, design, _ = run(tmp_path, "gauge.lib", bytes(range(256)) * 20)
    (finding,) = about(design, "netlist-unreadable")
    assert finding["file"] == "gauge.lib"
    assert "gauge.lib" in finding["message"]
    assert status == 1
    assert design["verdict"] == "hold"


def test_unknown_card_costs_only_itself(tmp_path):
    """A card of no known letter is named with its line, and the stage is still worked out."""
    _, design, _ = run(tmp_path, "gauge.cir", "station\n" + STAGE + "%9 out 0 what\n.end\n")
    (finding,) = about(design, "netlist-card")
    assert (finding["file"], finding["line"]) == ("gauge.cir", 11)
    assert design["stages"][0]["output"]["demand_high"] == pytest.approx(1.0, rel=0.01)


def test_missing_include_is_named_and_passed(tmp_path):
    """A missing library is told with its line; the device's name is enough to go on."""
    text = "station\n.include models/opamps.lib\n" + STAGE
    _, design, _ = run(tmp_path, "gauge.cir", text)
    (finding,) = about(design, "netlist-include")
    assert (finding["file"], finding["line"]) == ("gauge.cir", 2)
    assert "models/opamps.lib" in finding["message"]
    assert design["stages"][0]["catalogue"] == "TL07x"


def test_unknown_device_is_named_and_judged_by_practice(tmp_path):
    """An op-amp nobody lists is not checked against limits it does not have."""
    text = (
        "station\n"
        + STAGE.replace("TL072", "QX9072")
        + ".subckt QX9072 inp inn vcc vee out\n.ends\n"
    )
    _, design, _ = run(tmp_path, "gauge.cir", text)
    named = [n for n in design["not_checked"] if "QX9072" in n["why"]]
    named += [f for f in design["findings"] if "QX9072" in f["message"]]
    assert named
    assert design["verdict"] != "pass"


def test_division_by_zero_is_told_at_the_card(tmp_path):
    """An expression without a value costs the element that uses it."""
    text = "station\n.param zero=0\n" + STAGE + "R8 in 0 {1k/zero}\n"
    _, design, _ = run(tmp_path, "gauge.cir", text)
    (finding,) = about(design, "netlist-expression")
    assert (finding["file"], finding["line"]) == ("gauge.cir", 12)
    assert "divides by zero" in finding["message"]
    assert design["stages"][0]["output"]["demand_high"] == pytest.approx(1.0, rel=0.01)


def test_missing_file_is_a_finding(tmp_path):
    """A netlist that is not there is unreadable, and holds."""
    status, design, _ = command(tmp_path, "nowhere.cir")
    assert status == 1
    assert about(design, "netlist-unreadable")[0]["message"] == "nowhere.cir does not exist."


def test_bad_settings_are_one_sentence_and_status_two(tmp_path):
    """A settings file that cannot be obeyed names its line."""
    (tmp_path / "railguard.toml").write_text('[review]\nhold-at = "grave"\n')
    status, design, error = run(tmp_path, "gauge.cir", "station\n" + STAGE)
    assert status == 2
    assert design is None
    assert "railguard.toml, line 2" in error


def test_wrong_option_is_status_two(tmp_path):
    """A report format that does not exist is refused with the ones that do."""
    status, _, error = run(tmp_path, "gauge.cir", "station\n" + STAGE, "--report", "papyrus")
    assert status == 2
    assert "terminal" in error


def test_nothing_at_the_hold_level_is_status_zero(tmp_path):
    """A sound deck gives status 0; with a stricter level its minor findings give 1."""
    assert run(tmp_path, "gauge.cir", "station\n" + STAGE)[0] == 0
