-- The results of an audit. One row a file, found again by its path; everything else hangs on it.
CREATE TABLE IF NOT EXISTS about (name TEXT PRIMARY KEY, value TEXT NOT NULL) WITHOUT ROWID;

CREATE TABLE IF NOT EXISTS file (
    id INTEGER PRIMARY KEY,
    path TEXT NOT NULL UNIQUE,       -- below the root, behind the root's label where there are more
    state TEXT NOT NULL,             -- design, library, archive, unreadable, stopped, passed
    included INTEGER NOT NULL DEFAULT 0, -- 1: read through another deck, so no design of its own
    key TEXT NOT NULL,               -- of content, includes, settings and version
    run INTEGER NOT NULL,            -- the last run that met the file
    why TEXT NOT NULL DEFAULT '',
    sha256 TEXT NOT NULL DEFAULT '',
    title TEXT NOT NULL DEFAULT '',
    kind TEXT,
    verdict TEXT,
    critical INTEGER NOT NULL DEFAULT 0,
    major INTEGER NOT NULL DEFAULT 0,
    minor INTEGER NOT NULL DEFAULT 0,
    remark INTEGER NOT NULL DEFAULT 0,
    judged INTEGER NOT NULL DEFAULT 0,
    open INTEGER NOT NULL DEFAULT 0,
    stages INTEGER NOT NULL DEFAULT 0,
    circuit TEXT NOT NULL DEFAULT '', -- the netlist a deck of analyses includes
    seconds REAL NOT NULL DEFAULT 0   -- of processor time; in no report that is to be compared
);

CREATE TABLE IF NOT EXISTS finding (
    file INTEGER NOT NULL, number INTEGER NOT NULL, parent INTEGER NOT NULL,
    rule TEXT NOT NULL, family TEXT NOT NULL, severity TEXT NOT NULL,
    designators TEXT NOT NULL, nets TEXT NOT NULL, device TEXT NOT NULL,
    demand REAL, bound REAL, margin REAL, margin_share REAL, unit TEXT NOT NULL,
    message TEXT NOT NULL, remedy TEXT NOT NULL, source TEXT NOT NULL,
    place TEXT NOT NULL, line INTEGER, fingerprint TEXT NOT NULL, waived INTEGER NOT NULL,
    PRIMARY KEY (file, number)
) WITHOUT ROWID;

CREATE TABLE IF NOT EXISTS unknown (
    file INTEGER NOT NULL, designator TEXT NOT NULL, name TEXT NOT NULL,
    pins INTEGER NOT NULL, nearest TEXT NOT NULL
);
CREATE INDEX IF NOT EXISTS unknown_file ON unknown (file);

CREATE TABLE IF NOT EXISTS left_open (file INTEGER NOT NULL, rule TEXT NOT NULL, count INTEGER NOT NULL);
CREATE INDEX IF NOT EXISTS left_open_file ON left_open (file);

CREATE TABLE IF NOT EXISTS include (file INTEGER NOT NULL, path TEXT NOT NULL);
CREATE INDEX IF NOT EXISTS include_file ON include (file);
CREATE INDEX IF NOT EXISTS include_path ON include (path);

CREATE TABLE IF NOT EXISTS settings (path TEXT PRIMARY KEY, run INTEGER NOT NULL) WITHOUT ROWID;
