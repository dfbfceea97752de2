"""Workbook files: read whole, patched without loss."""
