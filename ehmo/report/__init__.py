"""Reports for people and machines: text and JSON."""
