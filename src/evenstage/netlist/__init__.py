"""Text to cards and back: read, elaborate, rewrite without touching the rest."""
