"""One module per question that a worksheet function asks."""
