"""Text in: files, encodings, includes, logical lines, cards."""
