"""What was billed: raw files become usage periods and a ledger of every repair."""
