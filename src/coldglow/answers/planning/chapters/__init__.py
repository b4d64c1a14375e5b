"""The chapters of the report: numbers of the answers turned into sections with figures and tables."""
