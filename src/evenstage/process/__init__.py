"""What a micron of transistor is worth: resistance, capacitance, limits, spelling of widths."""
