"""The spreadsheet's own functions, by topic, each declared with the kinds of its arguments."""
