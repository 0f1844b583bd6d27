"""Intent: what the user states about a design, from railguard.toml and from comment cards."""
