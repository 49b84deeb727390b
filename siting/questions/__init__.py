"""Follow-up questions on a plan: each a function on a study that returns a frozen result."""
