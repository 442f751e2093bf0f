"""A result as one self-contained page for a review."""
