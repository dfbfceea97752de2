"""Statistics: averages, spread, ranks, regression, criteria, distributions and tests."""
