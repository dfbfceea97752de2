"""Lookups: finding values in tables, and references to places."""
