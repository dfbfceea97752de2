"""Chemical-equilibrium worksheet functions, headless recalculation, and an audit of every formula."""

__version__ = "0.1.0"
