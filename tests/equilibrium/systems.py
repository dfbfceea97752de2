"""Random systems of several reactions, made from a seed.

This file was overwritten by mistake with the systems of one reaction, now in `single_systems.py`; what it held,
`error_of` and `random_problem`, has to be put back here.
"""
