"""Exports: results.json, CSV, GeoJSON, KML, GPX, and the report folder written whole or not at all.

Shows results and computes none.
"""
