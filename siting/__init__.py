"""Decide which sites to open, keep or close and which suppliers to sign."""
