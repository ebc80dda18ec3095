"""The review record: one model of figures, written as PDF, GeoPackage, CSV and JSON."""
