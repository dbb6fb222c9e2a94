"""Style sheets and scripts, all served from this folder."""
