"""What people look at: records, charts, the alignment tree and the HTML page."""
