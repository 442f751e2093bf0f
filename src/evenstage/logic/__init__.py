"""Transistors as switches: what every net is worth, and what that proves."""
