"""Dates and times: their parts, counting days, working days."""
