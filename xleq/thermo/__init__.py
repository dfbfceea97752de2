"""Formation data of species, and what follows from them."""
