"""Drawings of the report, as geometry: the templates turn them into SVG and escape their texts."""
