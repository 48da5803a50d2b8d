"""What a design should do: stages, amplifiers, chains and their response."""
