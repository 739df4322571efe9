"""From a plan to pages, lists and tables; only `save` touches the disk."""
