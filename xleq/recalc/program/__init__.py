"""Syntax trees compiled to closures: operators, references, calls, LET and LAMBDA."""
