"""Chemical formulas and reactions: reading, balancing, combining, and the text of K expressions."""
