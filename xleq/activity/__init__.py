"""Departure from ideal: gas fugacity, aqueous activity."""
