"""Arrays only: rate-law programs with exact derivatives, tanks and tubes; knows no chemistry and no sheet."""
