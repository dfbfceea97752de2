"""Text: joining, cutting, searching, characters, and numbers in text."""
