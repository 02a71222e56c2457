"""Excel for Windows: xlwings' COM server answers what the add-in's VBA asks."""
