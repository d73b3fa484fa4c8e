"""Words and pictures: results become HTML, JSON and plain text.  Nothing is computed here."""
