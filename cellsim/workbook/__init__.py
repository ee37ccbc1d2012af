"""Reading a workbook into frozen records."""
