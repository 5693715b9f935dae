"""What the commands show: one module per screen, laid out from results, nothing computed."""
