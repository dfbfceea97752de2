"""Chemical-equilibrium worksheet functions, and the headless recalculation of whole workbooks."""

__version__ = "0.1.0"
