"""Figures for a report: tracks and cross-plots of a review set, drawn as on the review page, as SVG, PNG or PDF."""
