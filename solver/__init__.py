"""The aerodynamics: from air, sections and planform to margins. Knows no screen."""
