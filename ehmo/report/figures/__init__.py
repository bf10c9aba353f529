"""Figures of reports, scans, batches and crystals."""
