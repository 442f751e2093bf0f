"""Devices to gates, stages and arcs, and a graph of them."""
