"""From cards to devices: parameters bound, the hierarchy laid out flat, metres."""
