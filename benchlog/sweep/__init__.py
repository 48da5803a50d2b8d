"""What to measure next: the schedule and the stepper; no clock, no wire."""
