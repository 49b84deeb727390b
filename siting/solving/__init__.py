"""How an answer is found."""
