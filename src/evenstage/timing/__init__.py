"""Arcs to delays, arrivals and paths with their side branches; comparison of two analyses."""
