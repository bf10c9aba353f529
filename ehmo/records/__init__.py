"""Frozen records that travel between the boxes."""
