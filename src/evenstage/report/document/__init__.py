"""Results as JSON documents, written and read: SI units, the unit in the key."""
