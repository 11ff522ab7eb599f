"""What the records of a book mean: forwards, volatilities and correlations of contracts, time and discounting."""
