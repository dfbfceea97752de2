"""Chemical equilibrium of one fluid with pure solids and liquids: problem in, certified solution out."""
