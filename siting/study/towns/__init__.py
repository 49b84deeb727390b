"""Towns of 1,000 people and more, and how the file of them was made."""
