"""What the weather was: station files become daily temperature, degree-days, a long-term year."""
