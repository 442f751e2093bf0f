"""Paths and blocks to new widths, with a proof of how good they are."""
