"""Slater-type basis functions and their overlap matrices."""
