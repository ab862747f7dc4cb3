"""Results as people and programs read them: tables, JSON and CSV records, figures."""
