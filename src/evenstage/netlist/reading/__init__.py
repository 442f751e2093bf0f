"""From bytes to cards: files, the canonical text, shapes, definitions."""
