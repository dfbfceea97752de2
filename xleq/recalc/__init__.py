"""Formulas parsed, compiled and evaluated as the spreadsheet would."""
