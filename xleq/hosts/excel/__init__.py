"""Worksheet functions live in Excel for Windows, through xlwings; everything is made from their table.

The modules that Excel's side needs import xlwings; the others run anywhere.
"""
