"""Numbers: rounding, powers, counting, numerals, angles, sums, matrices, chance."""
