"""Formula text and its syntax tree."""
