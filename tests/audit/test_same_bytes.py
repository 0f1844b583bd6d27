"""An archive gives the same reports whatever the number of workers and the environment."""

import pytest

from tests import environments
from tests.audit.designs import BARE, CLIPPED, LIBRARY, SOUND, UNKNOWN, put
from tests.audit.test_archives import zipped

FORMS = ("terminal", "html", "csv", "json")
KINDS = (SOUND, CLIPPED, BARE, UNKNOWN, LIBRARY)
WORKERS = {"C": 1, "German": 2, "Turkish": 4}
WAIVED = '* railguard: waive headroom-output XU1 "line test" until 2027-06-30\n'


@pytest.fixture(scope="module")
def reports(tmp_path_factory):
    """Return the reports of three audits, by environment and name."""
    root = tmp_path_factory.mktemp("share")
    put(root, **{f"lot{k % 4}/\u0131\u0130i\u00e4{k:02}.cir": KINDS[k % 5] for k in range(40)})
    put(root, **{"waived.cir": CLIPPED.replace("\n", f"\n{WAIVED}", 1)})
    put(root, **{"bench.cir": 'bench\n.include "waived.cir"\n.tran 1u 1m\n.end\n'})
    (root / "old.zip").write_bytes(zipped({f"{k}.cir": KINDS[k % 4].encode() for k in range(12)}))
    (root / "broken.zip").write_bytes(b"PK\x03\x04 no archive")
    made = environments.locales(tmp_path_factory.mktemp("locales"))
    found = {}
    for name, workers in WORKERS.items():
        out = tmp_path_factory.mktemp("out")
        base, older = str(out / "a.sqlite"), str(out / "b.sqlite")
        count = ["--workers", str(workers)]
        told = {"older": ["audit", str(root / "lot1"), "--to", older, *count]}
        told["run"] = ["audit", str(root), "--to", base, *count, "--as-of", "2027-01-31"]
        for form in FORMS:
            told[form] = ["audit", "report", base, "--as", form]
            told[f"{form} against"] = ["audit", "report", base, "--as", form, "--against", older]
        found[name] = environments.run(name, told, root, out, made)
    return found


@pytest.mark.parametrize("form", [*FORMS, *(f"{form} against" for form in FORMS)])
def test_workers_and_environment_change_nothing(form, reports):
    """One worker, two and four; C, German and Turkish."""
    first, *others = (by_name[form] for by_name in reports.values())
    assert first.strip()
    assert all(other == first for other in others)
    assert len(others) == 2
