"""What the maker wrote down about a board: its parts, tolerances, drive and budget."""
