"""Reading: the archive's parts, one by one, into the records of a workbook."""
