"""From files to a shop or a plan, or to the complete list of what is wrong with them."""
