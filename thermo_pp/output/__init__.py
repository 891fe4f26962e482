"""Output: tables and figures from results; nothing is computed here."""
