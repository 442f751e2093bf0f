"""From wished widths to edits, and from edits to bytes and files."""
