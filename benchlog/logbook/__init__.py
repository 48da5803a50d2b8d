"""The SQLite file that keeps every sweep."""
