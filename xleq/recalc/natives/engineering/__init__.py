"""Engineering: units, number bases, bits, complex numbers, Bessel functions."""
