"""The table of worksheet functions and their definitions by topic."""
