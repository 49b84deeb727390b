"""Outlines and place names of the whole world, and the script that derived them."""
