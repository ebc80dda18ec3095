"""Generator of demonstration data: an invented gravel river and its shallow-water results.

Nothing here describes a real place. ``python -m sample_reach`` makes every file in this folder's
``results`` and ``lines.gpkg``.
"""
