"""The book as the desk keeps it: records, their file, their changes. No Qt, no formula, no clock."""
