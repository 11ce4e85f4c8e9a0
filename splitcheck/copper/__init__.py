"""Files to marks to polygons: everything that reads what a CAD system exported."""
