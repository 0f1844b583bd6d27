"""An archive of old designs: found, reviewed in bounded workers, kept in one SQLite file."""
