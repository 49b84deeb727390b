"""The bounding engine: Lagrangean bounds, incumbents and branch and bound for large studies."""
