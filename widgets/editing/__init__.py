"""The editing panel: add, change, retire and dispute records of the graph in an overlay, try them, review them."""
