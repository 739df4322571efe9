"""Replanning a shift under way: least finish and lateness first, then least movement."""
