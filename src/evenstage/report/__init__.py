"""Any result as text for people and as JSON for scripts."""
