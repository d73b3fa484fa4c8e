"""Before against after: two fits and a long-term year become savings, their parts, their worth."""
