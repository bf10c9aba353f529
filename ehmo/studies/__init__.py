"""Many calculations on one fragment, or one set beside another."""
