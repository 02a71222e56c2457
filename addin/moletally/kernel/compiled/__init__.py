"""The compiled kernel (addin/kernel) called through ctypes: its library, what it is handed, its face."""
