"""Pictures: the stability region as text, SVG and PNG."""

from __future__ import annotations

from newel.results.pictures.region import RegionPicture, stability_region

__all__ = ["RegionPicture", "stability_region"]
