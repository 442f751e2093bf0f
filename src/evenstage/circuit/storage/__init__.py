"""Loops of nets that hold a value, and what they are."""
