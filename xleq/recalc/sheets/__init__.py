"""The cells of a workbook while they are evaluated."""
