"""What the analyst gives: tables and settings, read, checked and frozen."""
