"""Studies: coatings and uncertain numbers varied over many members of one case."""
