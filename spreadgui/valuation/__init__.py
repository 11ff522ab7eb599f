"""From a book to numbers: the slate, the results, and the columns that show both."""
