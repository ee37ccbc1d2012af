"""One module a sheet of the results workbook."""
