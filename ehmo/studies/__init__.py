"""Studies: many calculations on one fragment."""
