"""Tables and records for people, JSON for scripts."""
