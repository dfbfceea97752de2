"""Equilibrium constants: bases, scaling, summing, temperature."""
