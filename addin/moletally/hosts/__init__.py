"""Who calls the function table: headless recalculation first; hosts never import each other."""
