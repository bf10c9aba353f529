"""The report as one self-contained HTML file."""
