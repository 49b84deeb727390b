"""The web shell: entry script, kept drafts, and solves that run in processes of their own."""
